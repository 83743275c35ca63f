/**
 * Colours of every drawing, in light and dark: paper and ink, two status colours, and a few quiet ones.
 *
 * Blue and vermillion are of the Okabe–Ito palette; status is always told by shape as well.
 */

export interface Palette {
  readonly paper: string;
  readonly panel: string;
  readonly ink: string;
  readonly soft: string;
  readonly line: string;
  readonly faint: string;
  readonly satisfied: string;
  /** Met more than one milestone. */
  readonly deeper: string;
  readonly frustrated: string;
  /** The frustrated colour dark enough for text. */
  readonly frustratedText: string;
  /** Households without a decision (the last children), or outside a colouring. */
  readonly quiet: string;
  readonly green: string;
  readonly purple: string;
  /** Groups, told apart from the status colours. */
  readonly groups: readonly string[];
  /** A scale of one direction, least to most. */
  readonly ramp: readonly [string, string, string];
}

export const LIGHT: Palette = {
  paper: '#fbfaf6',
  panel: '#ffffff',
  ink: '#1b2430',
  soft: '#5d6878',
  line: '#dcdad2',
  faint: '#eeece5',
  satisfied: '#0072B2',
  deeper: '#003f66',
  frustrated: '#D55E00',
  frustratedText: '#b04a00',
  quiet: '#8b93a0',
  green: '#007a59',
  purple: '#a8487f',
  groups: ['#007a59', '#a8487f', '#8a6d00', '#5b5fb5', '#2b7f95', '#77716a'],
  ramp: ['#c2b48f', '#6f7d78', '#17202c'],
};

export const DARK: Palette = {
  paper: '#12161c',
  panel: '#181d25',
  ink: '#e8e6df',
  soft: '#9aa5b4',
  line: '#2b323d',
  faint: '#1f252e',
  satisfied: '#56B4E9',
  deeper: '#c4e6fb',
  frustrated: '#F08A3C',
  frustratedText: '#F08A3C',
  quiet: '#7d8794',
  green: '#3fbf95',
  purple: '#e08bbb',
  groups: ['#3fbf95', '#e08bbb', '#e0c04c', '#a3a6f0', '#6cc5da', '#b3aca3'],
  ramp: ['#5d5238', '#94a09b', '#f4f1e8'],
};
