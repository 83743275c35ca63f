/**
 * The sheet's own words: its questions, what each alternative is called, and what a new part starts from.
 *
 * What single settings mean is said once, in the study schema; nothing of it is repeated here.
 */
import type { Value } from './edit.js';

/** A question and the sections of the study that answer it. */
export interface Question {
  readonly id: string;
  /** Short, for the list of questions. */
  readonly short: string;
  readonly ask: string;
  readonly says: string;
  /** Top-level keys it covers. */
  readonly keys: readonly string[];
  /** Keys that are written in the text alone: the form says what they are and how many entries there are. */
  readonly inText?: readonly string[];
}

export const QUESTIONS: readonly Question[] = [
  {
    id: 'study',
    short: 'The study',
    ask: 'What is the study?',
    says: 'Its name, how long it looks ahead, and how often luck is drawn anew.',
    keys: ['study', 'seed', 'replicates', 'generations', 'years_per_generation', 'currency'],
  },
  {
    id: 'households',
    short: 'Households',
    ask: 'Who are the households?',
    says: 'The same households, with the same wealth at the start, stand in every arm.',
    keys: ['population'],
  },
  {
    id: 'looking',
    short: 'Whom they look at',
    ask: 'Whom do they look at?',
    says: 'Aspirations come from the wealth a household sees. A milestone is reached when the plan for the child gets there.',
    keys: ['reference'],
  },
  {
    id: 'investing',
    short: 'How they invest',
    ask: 'How do they invest?',
    says: 'What an investment in the child brings, the luck that falls on it, and what households weigh.',
    keys: ['technology', 'shock', 'preferences'],
  },
  {
    id: 'ties',
    short: 'Ties',
    ask: 'How are ties arranged?',
    says: 'Each arm is a network over the same households. An arm made from another keeps every household’s number of ties.',
    keys: ['arms'],
  },
  {
    id: 'programme',
    short: 'The programme',
    ask: 'What does the programme change?',
    says: 'Transfers, mentors and other changes in the course of a study are not simulated in this version. What can be compared is one arm against another: give an arm other ties, or other settings of its own.',
    keys: [],
  },
  {
    id: 'kept',
    short: 'Pockets and files',
    ask: 'What counts as a pocket, and what is kept?',
    says: 'How local aspiration traps are told from chance, and what the results folder holds.',
    keys: ['pockets', 'keep'],
    inText: ['estimates'],
  },
];

/** Name and sentence of an alternative. */
interface Alternative {
  readonly name: string;
  readonly says: string;
}

/** Alternatives by the key of their union and the variant's name. */
const ALTERNATIVES: Readonly<Record<string, Readonly<Record<string, Alternative>>>> = {
  places: {
    number: { name: 'of equal size', says: 'Every place has the same number of households.' },
    count: { name: 'of different sizes', says: 'Sizes spread around their mean.' },
  },
  technology: {
    linear: { name: 'linear', says: 'Every unit invested brings the same.' },
    concave: { name: 'concave', says: 'The more is invested, the less the next unit brings.' },
  },
  network: {
    blocks: {
      name: 'by place and group',
      says: 'Ties stay within places and groups as often as said (stochastic block model).',
    },
    similarity: { name: 'by similar wealth', says: 'Households of similar wealth rank are likelier to be tied.' },
    ring: { name: 'ring with shortcuts', says: 'Neighbours on a ring, some ties moved at random (small world).' },
    random: { name: 'at random', says: 'Every pair is as likely as any other (Erdős–Rényi).' },
    preferential: {
      name: 'to the well connected',
      says: 'Newcomers tie to households with many ties (Barabási–Albert).',
    },
    spatial: { name: 'by distance', says: 'Places lie in a plane; near households are tied (random geometric graph).' },
    configuration: {
      name: 'by number of ties',
      says: 'Each household has the number of ties said, partners drawn by place and group.',
    },
    file: { name: 'from a file', says: 'Ties that were observed: an edge list or GraphML.' },
    named: { name: 'a known small graph', says: 'For checks against published numbers.' },
    from: { name: 'made from another arm', says: 'The ties of that arm, mixed as said; everything else the same.' },
  },
  degrees: {
    poisson: { name: 'Poisson', says: 'As many as chance gives around the mean.' },
    lognormal: { name: 'lognormal', says: 'A few households have very many.' },
    file: { name: 'from a file', says: 'As observed.' },
  },
  mixing: {
    share: { name: 'a share of ties', says: 'Random swaps between pairs of ties.' },
    target: { name: 'toward a target', says: 'Swaps are kept that come nearer to a measure of segregation.' },
  },
  panel: {
    all: { name: 'all rows', says: 'Every household in every generation and replicate.' },
    none: { name: 'no rows', says: 'Indicators only.' },
    replicates: { name: 'a part', says: 'Some replicates, generations or households.' },
  },
};

/** What an alternative is called. */
export function alternative(key: string, variant: string): Alternative {
  return ALTERNATIVES[key]?.[variant] ?? { name: variant.replaceAll('_', ' '), says: '' };
}

/** What leaving a choice of alternatives out is called. */
export const LEFT_OUT: Readonly<Record<string, string>> = {
  places: 'one place',
  mixing: 'no mixing',
};

const CHOICES: Readonly<Record<string, string>> = {
  upward_mean: 'mean of the richer',
  similarity_mean: 'mean of the similar',
  max: 'maximum',
  neighbours: 'its ties',
  second_circle: 'ties of its ties',
  self: 'itself',
  group: 'its group',
  place: 'its place',
  society: 'everyone',
  pareto_tail: 'lognormal with a Pareto tail',
  quantile_shares: 'shares by quantile group',
  sample: 'drawn from a survey',
  economic_connectedness: 'economic connectedness',
  assortativity: 'assortativity of wealth rank',
  e_i_group: 'E–I index of groups',
  within_place: 'within each place',
};

/** A choice in words. */
export function choiceWord(value: string): string {
  return CHOICES[value] ?? value.replaceAll('_', ' ');
}

/** What an entry of a list is called. */
export const ENTRY: Readonly<Record<string, string>> = {
  groups: 'group',
  milestones: 'milestone',
  mix: 'part',
  arms: 'arm',
  quantile_shares: 'share',
};

/** Values that a required setting starts from when its part is added; the writer changes them. */
const STARTERS: Readonly<Record<string, Value>> = {
  households: 1000,
  places: 20,
  count: 20,
  shape: 'lognormal',
  mean: 100,
  gini: 0.42,
  pareto_tail: { above_quantile: 0.95, exponent: 1.8 },
  quantile_shares: [0.04, 0.09, 0.14, 0.22, 0.51],
  sample: { file: 'survey.csv', column: 'wealth' },
  file: 'survey.csv',
  column: 'wealth',
  above_quantile: 0.95,
  exponent: 1.8,
  kind: 'linear',
  gross_return: 2.5,
  scale: 8,
  elasticity: 0.6,
  curvature: 0.6,
  child_weight: 0.35,
  loss_aversion: 2,
  milestone_curvature: 0.6,
  from: 'neighbours',
  weight: 0,
  q: 0.75,
  window: 0.5,
  mean_degree: 10,
  within_place: 0.9,
  strength: 0.6,
  degree: 10,
  ties: 5,
  spread: 0.3,
  degrees: { kind: 'poisson', mean: 10 },
  sd_log: 0.5,
  path: 'ties.csv',
  name: 'cycle',
  share: 0.5,
  target: 'economic_connectedness',
  value: 0.95,
  replicates: 1,
  wealth: { shape: 'lognormal', mean: 100, gini: 0.42 },
};

/** What a required setting starts from; undefined when this file does not know it (a test sees that it does). */
export function starter(key: string): Value | undefined {
  return STARTERS[key];
}
