/**
 * A link brings the same view back, and nothing else.
 */
import fc from 'fast-check';
import { expect, test } from 'vitest';
import { COLOURINGS } from '../../viewer/field/colouring.js';
import { fromLink, START, TABS, toLink, type View } from '../../viewer/screen/view.js';

const anyView: fc.Arbitrary<View> = fc.record({
  replicate: fc.nat(1000),
  generation: fc.nat(100),
  left: fc.nat(5),
  right: fc.nat(5),
  arrangement: fc.constantFrom('ladder', 'map'),
  colouring: fc.constantFrom(...COLOURINGS),
  ties: fc.boolean(),
  household: fc.option(fc.nat(1_000_000)),
  pocket: fc.constant(null),
  tab: fc.constantFrom(...TABS),
});

test('any view survives the way through a link', () => {
  fc.assert(
    fc.property(anyView, (view) => {
      expect(fromLink(`#${toLink(view)}`, START)).toEqual(view);
    }),
  );
});

test('what a link says wrongly stays as it was', () => {
  const view = { ...START, generation: 3 };
  fc.assert(
    fc.property(fc.string(), (junk) => {
      const found = fromLink(
        `#generation=x${junk}&arrangement=${junk}-&colour=${junk}-&tab=${junk}-&arms=${junk}-`,
        view,
      );
      expect(found).toEqual(view);
    }),
  );
});
