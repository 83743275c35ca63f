/** Parsers of option values, with errors of ours. */
import { InputError } from '../../network/errors.js';

/** Parser of a whole-number option. */
export function wholeNumber(option: string, least: number): (text: string) => number {
  return (text) => {
    const n = Number(text);
    if (/^\d+$/.test(text) && n >= least) return n;
    throw new InputError({
      code: 'bad-option',
      place: option,
      problem: `'${text}' is not a whole number of at least ${least}`,
      remedy: `give one, such as ${option} ${Math.max(least, 2)}`,
    });
  };
}

/** Parser of a number option. */
export function number(option: string): (text: string) => number {
  return (text) => {
    const x = Number(text);
    if (text.trim() !== '' && Number.isFinite(x)) return x;
    throw new InputError({
      code: 'bad-option',
      place: option,
      problem: `'${text}' is not a number`,
      remedy: 'give a number',
    });
  };
}
