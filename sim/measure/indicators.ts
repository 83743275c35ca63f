/**
 * The registry of indicators: one row of numbers for each arm, replicate and generation.
 *
 * One definition serves `indicators.csv`, the contrasts, the codebook, the report and the viewer; adding an
 * indicator is one entry here. The measures themselves are in their own files. Knows nothing of files or arms.
 */
import { log } from '../../network/elementary.js';
import type { Ties, Uniform } from '../../network/graph.js';
import { assortativity } from '../../network/measure/assortativity.js';
import { type EconomicConnectedness, economicConnectedness } from '../../network/measure/economic-connectedness.js';
import { type JoinCount, joinCounts } from '../../network/measure/join-counts.js';
import { type Moran, moran } from '../../network/measure/moran.js';
import type { Causes } from './cause.js';
import { dipPValue, dip as hartigansDip } from './dip.js';
import { duclosEstebanRay } from './duclos-esteban-ray.js';
import { type RatioMeasures, ratioMeasures, theilTBetween } from './entropy.js';
import { estebanRayOfClasses } from './esteban-ray.js';
import type { Fates } from './fates.js';
import { meanAspirationGap, shareFrustrated } from './frustration.js';
import { gini } from './gini.js';
import { lorenz } from './lorenz.js';
import { line, upwardMobility } from './mobility.js';
import { densityModes } from './modes.js';
import { averageRanks } from './order.js';
import type { PocketCensus } from './pocket-tracker.js';
import { quantileOfSorted } from './quantile.js';
import { type Sample, sampleOf } from './sample.js';
import { variance } from './spread.js';
import { type TieFacts, tieFacts } from './tie-facts.js';
import { joinCountNull, moranNull, NORMAL_FROM } from './tie-null.js';
import { wolfson } from './wolfson.js';

/** What one generation of one arm is measured from. Arrays are read, never kept or changed. */
export interface IndicatorInput {
  /** Wealth of the generation, above 0, length n. */
  readonly wealth: Float64Array;
  /** Place of each household, 0 … places−1. */
  readonly place: Uint32Array;
  readonly places: number;
  /** Social group of each household, 0 … groups−1. */
  readonly group: Uint32Array;
  readonly groups: number;
  readonly ties: Ties;
  /** What households decided, or null in the last row, which holds only the final children. */
  readonly decision: {
    /** 1 where no milestone is met. */
    readonly frustrated: Uint8Array;
    /** Aspiration of the first milestone. */
    readonly aspiration: Float64Array;
  } | null;
  /** The generation before, by household; null in generation 0. */
  readonly parent: {
    readonly wealth: Float64Array;
    /** `rank` and `logWealth` of the context of that generation, when it is still at hand: saves a sort. */
    readonly rank?: Float64Array | undefined;
    readonly logWealth?: Float64Array | undefined;
  } | null;
  /**
   * Measures of the ties and permutations of tests over them, from `tieFacts`: give the same object for every
   * generation while ties do not change. Made from `permutations` and `uniform` when left out, which costs more than
   * all the rest of a row.
   */
  readonly tieFacts?: TieFacts | undefined;
  /** Random permutations for p-values; used only without `tieFacts`. */
  readonly permutations: number;
  /** Stream the permutations are drawn from; used only without `tieFacts`. */
  readonly uniform: Uniform;
  /** Pockets of the generation, from a `PocketTracker`; null or left out where there is no decision. */
  readonly pockets?: PocketCensus | null | undefined;
  /** Causes of frustration, from `causesOf`; null or left out where they were not worked out. */
  readonly causes?: Causes | null | undefined;
  /** What became of last generation's pockets and frustrated households; left out where there is no decision. */
  readonly fates?: Fates | null | undefined;
}

/** A generation with the pieces that several indicators share, each made when first asked for. */
export class IndicatorContext {
  readonly input: IndicatorInput;
  readonly n: number;
  #sample: Sample | undefined;
  #logWealth: Float64Array | undefined;
  #sortedLog: Sample | undefined;
  #rank: Float64Array | undefined;
  #ratios: RatioMeasures | undefined;
  #curve: Float64Array | undefined;
  #dip: number | undefined;
  #modes: number | undefined;
  #sdLog: number | undefined;
  #ties: TieFacts | undefined;
  #moran: Moran | undefined;
  #joins: JoinCount | undefined;
  #connectedness: EconomicConnectedness | undefined;

  constructor(input: IndicatorInput) {
    this.input = input;
    this.n = input.wealth.length;
  }

  /** Wealth in ascending order. */
  get sample(): Sample {
    this.#sample ??= sampleOf(this.input.wealth);
    return this.#sample;
  }

  /** Natural logarithm of wealth, by household. */
  get logWealth(): Float64Array {
    if (this.#logWealth === undefined) {
      const { wealth } = this.input;
      this.#logWealth = new Float64Array(this.n);
      for (let i = 0; i < this.n; i++) this.#logWealth[i] = log(wealth[i]);
    }
    return this.#logWealth;
  }

  /** Log wealth in ascending order: the order of wealth itself, so no second sort. */
  get sortedLog(): Sample {
    if (this.#sortedLog === undefined) {
      const { order, n } = this.sample;
      const logs = this.logWealth;
      const value = new Float64Array(n);
      let sum = 0;
      for (let k = 0; k < n; k++) {
        value[k] = logs[order[k]];
        sum += value[k];
      }
      this.#sortedLog = { n, value, weight: null, order, total: n, sum, mean: sum / n };
    }
    return this.#sortedLog;
  }

  /** Average rank of wealth, 1 … n, by household. */
  get rank(): Float64Array {
    this.#rank ??= averageRanks(this.input.wealth, this.sample.order);
    return this.#rank;
  }

  get ratios(): RatioMeasures {
    this.#ratios ??= ratioMeasures(this.sample);
    return this.#ratios;
  }

  /** Lorenz ordinates at 0.4 and 0.9. */
  get curve(): Float64Array {
    this.#curve ??= lorenz(this.sample, [0.4, 0.9]);
    return this.#curve;
  }

  /** Modes that stand out of the log-wealth density. */
  get modes(): number {
    this.#modes ??= densityModes(this.sortedLog).length;
    return this.#modes;
  }

  /** Standard deviation of log wealth, denominator n. */
  get sdLog(): number {
    this.#sdLog ??= Math.sqrt(variance(this.sortedLog));
    return this.#sdLog;
  }

  /** What is known of the ties alone. */
  get ties(): TieFacts {
    const { ties, place, group, permutations, uniform } = this.input;
    this.#ties ??= this.input.tieFacts ?? tieFacts(ties, place, group, permutations, uniform);
    return this.#ties;
  }

  /** Moran's I of log wealth, row-standardised weights. */
  get moran(): Moran {
    this.#moran ??= moran(this.input.ties, this.logWealth, 'row');
    return this.#moran;
  }

  /** Ties between two frustrated households, binary weights. */
  get joins(): JoinCount {
    this.#joins ??= joinCounts(this.input.ties, decisionOf(this).frustrated, 'binary').marked;
    return this.#joins;
  }

  get connectedness(): EconomicConnectedness {
    this.#connectedness ??= economicConnectedness(this.input.ties, this.input.wealth, this.input.place);
    return this.#connectedness;
  }

  /** Dip of log wealth. */
  get dip(): number {
    this.#dip ??= hartigansDip(this.sortedLog).dip;
    return this.#dip;
  }
}

/** What an indicator cannot do without; its cell is empty where that is missing. */
export type Need = 'wealth' | 'decision' | 'parent' | 'ties' | 'pockets' | 'causes' | 'fates';

/** One column of `indicators.csv`. */
export interface Indicator {
  /** Column name. */
  readonly name: string;
  /** What it says, for a reader of the codebook. */
  readonly meaning: string;
  readonly formula: string;
  /** Publication, or a note on common practice. */
  readonly source: string;
  /** `wealth` (the study's currency), `share` (0 … 1), `count`, `probability`, `index` (no unit). */
  readonly unit: 'wealth' | 'share' | 'count' | 'probability' | 'index';
  readonly needs: readonly Need[];
  /** The value, NaN where it is not defined. Called only when its needs are met. */
  readonly of: (context: IndicatorContext) => number;
}

/** Every indicator, in the order of the columns. */
export const INDICATORS: readonly Indicator[] = [
  {
    name: 'mean_wealth',
    meaning: 'Mean wealth',
    formula: 'Σ y / n',
    source: 'definition',
    unit: 'wealth',
    needs: ['wealth'],
    of: (c) => c.sample.mean,
  },
  {
    name: 'median_wealth',
    meaning: 'Median wealth, the middle two averaged when their number is even',
    formula: 'quantile ½, type 7',
    source: 'Hyndman and Fan 1996',
    unit: 'wealth',
    needs: ['wealth'],
    of: (c) => quantileOfSorted(c.sample.value, 0.5),
  },
  {
    name: 'gini',
    meaning: 'Gini coefficient of wealth, plug-in form (all n² pairs, no n/(n−1))',
    formula: 'Σ (2i − n − 1) y_(i) / (n Σ y)',
    source: 'Gini 1912',
    unit: 'index',
    needs: ['wealth'],
    of: (c) => gini(c.sample),
  },
  {
    name: 'theil_t',
    meaning: 'Theil T of wealth, GE(1)',
    formula: 'mean of r ln r, r = y/mean',
    source: 'Theil 1967',
    unit: 'index',
    needs: ['wealth'],
    of: (c) => c.ratios.theilT,
  },
  {
    name: 'theil_l',
    meaning: 'Theil L of wealth, mean log deviation, GE(0)',
    formula: 'mean of −ln r, r = y/mean',
    source: 'Theil 1967',
    unit: 'index',
    needs: ['wealth'],
    of: (c) => c.ratios.theilL,
  },
  {
    name: 'theil_t_between_places',
    meaning: 'Part of Theil T between places; the rest lies within them',
    formula: 'Σ s_g ln(mean_g/mean), s_g the place’s share of wealth',
    source: 'Theil 1967',
    unit: 'index',
    needs: ['wealth'],
    of: ({ input }) => theilTBetween(input.wealth, input.place, input.places),
  },
  {
    name: 'theil_t_between_groups',
    meaning: 'Part of Theil T between social groups; the rest lies within them',
    formula: 'Σ s_g ln(mean_g/mean), s_g the group’s share of wealth',
    source: 'Theil 1967',
    unit: 'index',
    needs: ['wealth'],
    of: ({ input }) => theilTBetween(input.wealth, input.group, input.groups),
  },
  {
    name: 'atkinson_half',
    meaning: 'Atkinson index of wealth, inequality aversion ½',
    formula: '1 − (mean of √r)², r = y/mean',
    source: 'Atkinson 1970',
    unit: 'index',
    needs: ['wealth'],
    of: (c) => c.ratios.atkinsonHalf,
  },
  {
    name: 'atkinson_1',
    meaning: 'Atkinson index of wealth, inequality aversion 1',
    formula: '1 − exp(mean of ln r), r = y/mean',
    source: 'Atkinson 1970',
    unit: 'index',
    needs: ['wealth'],
    of: (c) => c.ratios.atkinson1,
  },
  {
    name: 'atkinson_2',
    meaning: 'Atkinson index of wealth, inequality aversion 2',
    formula: '1 − 1/mean of (1/r), r = y/mean',
    source: 'Atkinson 1970',
    unit: 'index',
    needs: ['wealth'],
    of: (c) => c.ratios.atkinson2,
  },
  {
    name: 'share_bottom_40',
    meaning: 'Share of wealth held by the poorest four tenths (Lorenz curve, straight between households)',
    formula: 'L(0.4)',
    source: 'Lorenz 1905',
    unit: 'share',
    needs: ['wealth'],
    of: (c) => c.curve[0],
  },
  {
    name: 'share_top_10',
    meaning: 'Share of wealth held by the richest tenth (Lorenz curve, straight between households)',
    formula: '1 − L(0.9)',
    source: 'Lorenz 1905',
    unit: 'share',
    needs: ['wealth'],
    of: (c) => 1 - c.curve[1],
  },
  {
    name: 'p90_p10',
    meaning: 'Ratio of the 90th to the 10th percentile of wealth, type-7 quantiles',
    formula: 'Q(0.9) / Q(0.1)',
    source: 'Hyndman and Fan 1996',
    unit: 'index',
    needs: ['wealth'],
    of: ({ sample }) => quantileOfSorted(sample.value, 0.9) / quantileOfSorted(sample.value, 0.1),
  },
  {
    name: 'palma',
    meaning: 'Palma ratio: share of the richest tenth over that of the poorest four tenths',
    formula: '(1 − L(0.9)) / L(0.4)',
    source: 'Palma 2011',
    unit: 'index',
    needs: ['wealth'],
    of: ({ curve }) => (1 - curve[1]) / curve[0],
  },
  {
    name: 'esteban_ray',
    meaning: 'Esteban–Ray polarisation (α = ½, K = 1) of the three wealth classes that stand for the distribution best',
    formula: 'Σ Σ p_i^1.5 p_j |m_i − m_j|, p the class shares, m the class means over the mean',
    source: 'Esteban and Ray 1994; classes after Esteban, Gradín and Ray 2007',
    unit: 'index',
    needs: ['wealth'],
    of: (c) => estebanRayOfClasses(c.sample, 0.5),
  },
  {
    name: 'der_half',
    meaning: 'Duclos–Esteban–Ray polarisation, α = ½, wealth in units of its mean, not halved',
    formula: 'mean of √f(r) · mean |r − r_j|, r = y/mean, f a Gaussian kernel density, bandwidth 4.7 σ α^0.1/√n',
    source: 'Duclos, Esteban and Ray 2004',
    unit: 'index',
    needs: ['wealth'],
    of: (c) => duclosEstebanRay(c.sample, 0.5),
  },
  {
    name: 'wolfson',
    meaning: 'Wolfson’s index of bipolarisation',
    formula: '2 (2 (½ − L(½)) − Gini) mean/median',
    source: 'Wolfson 1994',
    unit: 'index',
    needs: ['wealth'],
    of: (c) => wolfson(c.sample),
  },
  {
    name: 'dip',
    meaning: 'Hartigan’s dip of log wealth: distance to the nearest distribution with one mode',
    formula: 'min over unimodal F of sup |F_n − F|',
    source: 'Hartigan and Hartigan 1985',
    unit: 'index',
    needs: ['wealth'],
    of: (c) => c.dip,
  },
  {
    name: 'dip_p',
    meaning: 'p-value of the dip against the uniform distribution (small: more than one mode)',
    formula: 'interpolated in √n × dip from simulated quantiles',
    source: 'Hartigan and Hartigan 1985; table by M. Maechler',
    unit: 'probability',
    needs: ['wealth'],
    of: (c) => dipPValue(c.dip, c.n),
  },
  {
    name: 'modes',
    meaning: 'Modes of the log-wealth density that stand out by at least 5 % of the highest',
    formula: 'local maxima of a Gaussian kernel density, bandwidth 0.9 min(sd, IQR/1.34) n^(−1/5)',
    source: 'Silverman 1986, eq. 3.31',
    unit: 'count',
    needs: ['wealth'],
    of: (c) => c.modes,
  },
  {
    name: 'elasticity',
    meaning: 'Intergenerational elasticity of wealth between this generation and its parents',
    formula: 'least-squares slope of ln y_t on ln y_(t−1)',
    source: 'Solon 1992',
    unit: 'index',
    needs: ['wealth', 'parent'],
    of: (c) => line(logsOfParent(c), c.logWealth).slope,
  },
  {
    name: 'rank_rank_slope',
    meaning: 'Rank–rank slope between this generation and its parents, ties sharing their average rank',
    formula: 'least-squares slope of rank(y_t) on rank(y_(t−1))',
    source: 'Chetty, Hendren, Kline and Saez 2014',
    unit: 'index',
    needs: ['wealth', 'parent'],
    of: (c) => line(parentOf(c).rank ?? averageRanks(parentOf(c).wealth), c.rank).slope,
  },
  {
    name: 'upward_mobility',
    meaning: 'Absolute upward mobility: share of households with more wealth than their parents',
    formula: 'share of y_t > y_(t−1)',
    source: 'Chetty et al. 2017',
    unit: 'share',
    needs: ['wealth', 'parent'],
    of: (c) => upwardMobility(parentOf(c).wealth, c.input.wealth),
  },
  {
    name: 'share_frustrated',
    meaning: 'Share of households whose plan meets no milestone',
    formula: 'mean of frustrated',
    source: 'definition',
    unit: 'share',
    needs: ['decision'],
    of: (c) => shareFrustrated(decisionOf(c).frustrated),
  },
  {
    name: 'mean_aspiration_gap',
    meaning: 'Mean distance of wealth below the first milestone’s aspiration, relative to the aspiration',
    formula: 'mean of 1 − y/a_1',
    source: 'Ray 2006; the measure is common practice',
    unit: 'index',
    needs: ['decision'],
    of: (c) => meanAspirationGap(c.input.wealth, decisionOf(c).aspiration),
  },
  {
    name: 'join_count',
    meaning: 'Ties between two frustrated households',
    formula: 'Σ over ties of frustrated_i · frustrated_j',
    source: 'Cliff and Ord 1981, pp. 19–20',
    unit: 'count',
    needs: ['decision', 'ties'],
    of: (c) => c.joins.count,
  },
  {
    name: 'join_count_expected',
    meaning: 'Expected ties between frustrated households if the same number were scattered over the tied households',
    formula: 'ties · f (f − 1) / (n (n − 1)), f frustrated among n tied households',
    source: 'Cliff and Ord 1981, pp. 19–20',
    unit: 'count',
    needs: ['decision', 'ties'],
    of: (c) => c.joins.expected,
  },
  {
    name: 'join_count_z',
    meaning: 'Join count above its expectation, in standard deviations of that scattering',
    formula: '(count − expected) / √variance, nonfree sampling',
    source: 'Cliff and Ord 1981, pp. 19–20',
    unit: 'index',
    needs: ['decision', 'ties'],
    of: (c) => c.joins.z,
  },
  {
    name: 'join_count_p',
    meaning:
      'Permutation p-value of as many ties between frustrated households or more (normal approximation from 50,000)',
    formula:
      '(1 + permutations with at least as many) / (1 + permutations); drawing stops once a tenth of the permutations have reached it (p above 0.1)',
    source: 'Cliff and Ord 1981',
    unit: 'probability',
    needs: ['decision', 'ties'],
    of: (c) =>
      c.ties.list.tied >= NORMAL_FROM ? c.joins.p : joinCountNull(c.ties.list, decisionOf(c).frustrated, c.ties.plan).p,
  },
  {
    name: 'moran',
    meaning: 'Moran’s I of log wealth over the ties, row-standardised weights, households without ties left out',
    formula: '(n / S0) Σ w_ij z_i z_j / Σ z_i²',
    source: 'Moran 1950; Cliff and Ord 1981',
    unit: 'index',
    needs: ['wealth', 'ties'],
    of: (c) => c.moran.i,
  },
  {
    name: 'moran_expected',
    meaning: 'Expected Moran’s I without dependence',
    formula: '−1 / (n − 1)',
    source: 'Cliff and Ord 1981',
    unit: 'index',
    needs: ['wealth', 'ties'],
    of: (c) => c.moran.expected,
  },
  {
    name: 'moran_p',
    meaning: 'Two-sided permutation p-value of Moran’s I (normal approximation from 50,000 households with ties)',
    formula:
      '(1 + permutations as far from the expectation) / (1 + permutations); drawing stops once a tenth of the permutations have reached it (p above 0.1)',
    source: 'Cliff and Ord 1981',
    unit: 'probability',
    needs: ['wealth', 'ties'],
    of: (c) =>
      c.ties.list.tied >= NORMAL_FROM ? c.moran.pRandom : moranNull(c.ties.list, c.logWealth, c.moran.i, c.ties.plan).p,
  },
  {
    name: 'assortativity_wealth',
    meaning: 'Assortativity of wealth: correlation of wealth at the two ends of a tie',
    formula: 'correlation over tie ends',
    source: 'Newman 2003, eq. 21',
    unit: 'index',
    needs: ['wealth', 'ties'],
    of: ({ input }) => assortativity(input.ties, input.wealth),
  },
  {
    name: 'assortativity_rank',
    meaning: 'Assortativity of wealth rank',
    formula: 'correlation of ranks over tie ends, tied values sharing their average rank',
    source: 'Newman 2003, eq. 21',
    unit: 'index',
    needs: ['wealth', 'ties'],
    of: (c) => assortativity(c.input.ties, c.rank),
  },
  {
    name: 'assortativity_group',
    meaning: 'Assortativity by social group',
    formula: '(Σ e_gg − Σ a_g²) / (1 − Σ a_g²)',
    source: 'Newman 2003, eq. 2',
    unit: 'index',
    needs: ['ties'],
    of: (c) => c.ties.assortativityGroup,
  },
  {
    name: 'assortativity_place',
    meaning: 'Assortativity by place',
    formula: '(Σ e_pp − Σ a_p²) / (1 − Σ a_p²)',
    source: 'Newman 2003, eq. 2',
    unit: 'index',
    needs: ['ties'],
    of: (c) => c.ties.assortativityPlace,
  },
  {
    name: 'coleman_group',
    meaning:
      'Coleman’s homophily index by social group: ties inside groups above chance, over the most they could exceed it',
    formula: 'Σ ends_g (H_g − w_g) / Σ ends_g (1 − w_g)',
    source: 'Coleman 1958',
    unit: 'index',
    needs: ['ties'],
    of: (c) => c.ties.colemanGroup,
  },
  {
    name: 'e_i_group',
    meaning: 'E–I index by social group: external less internal ties, over all ties',
    formula: '(E − I) / (E + I)',
    source: 'Krackhardt and Stern 1988',
    unit: 'index',
    needs: ['ties'],
    of: (c) => c.ties.externalInternalGroup,
  },
  {
    name: 'economic_connectedness',
    meaning: 'Economic connectedness: twice the share of above-median households among the ties of below-median ones',
    formula: 'mean of 2 · above-median ties / ties over below-median households with ties',
    source: 'Chetty et al. 2022',
    unit: 'index',
    needs: ['wealth', 'ties'],
    of: (c) => c.connectedness.connectedness,
  },
  {
    name: 'exposure',
    meaning: 'Exposure: twice the share of above-median households in the places of below-median ones',
    formula: 'mean of 2 · above-median share of the place over below-median households with ties',
    source: 'Chetty et al. 2022',
    unit: 'index',
    needs: ['wealth', 'ties'],
    of: (c) => c.connectedness.exposure,
  },
  {
    name: 'friending_bias',
    meaning: 'Friending bias: how far ties of below-median households fall short of what their place offers',
    formula: 'mean over places, by their households, of 1 − connectedness / exposure',
    source: 'Chetty et al. 2022',
    unit: 'index',
    needs: ['wealth', 'ties'],
    of: (c) => c.connectedness.friendingBias,
  },
  {
    name: 'pockets',
    meaning: 'Pockets of frustration, significant or not',
    formula: 'connected components of core households with at least min_size of them',
    source: 'this project',
    unit: 'count',
    needs: ['decision', 'pockets'],
    of: (c) => pocketsOf(c).pockets,
  },
  {
    name: 'pocket_share',
    meaning: 'Share of households that are core members of a pocket',
    formula: 'core members of pockets / n',
    source: 'this project',
    unit: 'share',
    needs: ['decision', 'pockets'],
    of: (c) => pocketsOf(c).pocketShare,
  },
  {
    name: 'pocket_p',
    meaning:
      'Permutation p-value of the share of core households (in a pocket or not); empty while nobody has been frustrated for long enough',
    formula:
      '(1 + permutations with at least as many core households) / (1 + permutations); drawing stops once a tenth of the permutations have reached it (p above 0.1)',
    source: 'this project',
    unit: 'probability',
    needs: ['decision', 'pockets'],
    of: (c) => pocketsOf(c).pValue,
  },
  {
    name: 'sheltered_share',
    meaning: 'Share of households that are satisfied now and would be frustrated under the society-wide mean',
    formula: 'mean of sheltered',
    source: 'this project',
    unit: 'share',
    needs: ['decision', 'causes'],
    of: (c) => shareFrustrated(causesOfContext(c).sheltered),
  },
  {
    name: 'complacent_share',
    meaning: 'Share of households that are satisfied, yet grow more slowly than they would under the society-wide mean',
    formula: 'mean of complacent',
    source: 'this project',
    unit: 'share',
    needs: ['decision', 'causes'],
    of: (c) => shareFrustrated(causesOfContext(c).complacent),
  },
  {
    name: 'core_share',
    meaning: 'Share of households that are core: long frustrated, with frustrated company',
    formula: 'core households / n',
    source: 'this project',
    unit: 'share',
    needs: ['decision', 'pockets'],
    of: (c) => pocketsOf(c).coreShare,
  },
  {
    name: 'significant_pockets',
    meaning: 'Pockets that are more than chance at the 5 % level',
    formula: 'pockets with p ≤ 0.05',
    source: 'this project',
    unit: 'count',
    needs: ['decision', 'pockets'],
    of: (c) => pocketsOf(c).significant,
  },
  {
    name: 'pocket_persistence',
    meaning: 'Of the households that were core members of a pocket a generation ago, the share that is frustrated',
    formula: 'mean of frustrated over last generation’s core members of pockets',
    source: 'this project',
    unit: 'share',
    needs: ['decision', 'fates'],
    of: (c) => fatesOf(c).pocketPersistence,
  },
  {
    name: 'frustration_persistence',
    meaning: 'Of the households that were frustrated a generation ago, the share that is frustrated',
    formula: 'mean of frustrated over last generation’s frustrated households',
    source: 'this project',
    unit: 'share',
    needs: ['decision', 'fates'],
    of: (c) => fatesOf(c).frustrationPersistence,
  },
  {
    name: 'pocket_satisfied_elsewhere',
    meaning: 'Of the core members of pockets, the share that is satisfied in the other arm at the same time',
    formula: 'mean of 1 − contrast_frustrated over core members of pockets',
    source: 'this project',
    unit: 'share',
    needs: ['decision', 'fates'],
    of: (c) => fatesOf(c).satisfiedElsewhere,
  },
  {
    name: 'local_share',
    meaning:
      'Share of households that are frustrated by their own reference and would meet a milestone under the society-wide mean',
    formula: 'mean of cause = local',
    source: 'this project',
    unit: 'share',
    needs: ['decision', 'causes'],
    of: (c) => localShare(causesOfContext(c)),
  },
  {
    name: 'isolation_by_place',
    meaning: 'Isolation of groups in their places: share of its own group in a household’s place, mean over households',
    formula: 'mean over households of (members of its group in its place / households of its place)',
    source: 'Bell 1954; Massey and Denton 1988',
    unit: 'share',
    needs: ['ties'],
    of: (c) => c.ties.isolationPlace,
  },
  {
    name: 'isolation_by_ties',
    meaning: 'Isolation of groups by ties: share of its own group among a household’s ties, mean over groups’ members',
    formula: 'mean over households of its group’s mean share of own-group ties',
    source: 'Bell 1954; by ties: this project',
    unit: 'share',
    needs: ['ties'],
    of: (c) => c.ties.isolationTies,
  },
  {
    name: 'sd_log_wealth',
    meaning: 'Standard deviation of log wealth',
    formula: '√ of the mean squared deviation of ln y',
    source: 'definition',
    unit: 'index',
    needs: ['wealth'],
    of: (c) => c.sdLog,
  },
];

function parentOf({ input }: IndicatorContext): NonNullable<IndicatorInput['parent']> {
  if (input.parent === null) throw new Error('this indicator needs a parent generation');
  return input.parent;
}

function decisionOf({ input }: IndicatorContext): NonNullable<IndicatorInput['decision']> {
  if (input.decision === null) throw new Error('this indicator needs a decision');
  return input.decision;
}

function pocketsOf({ input }: IndicatorContext): PocketCensus {
  if (!input.pockets) throw new Error('this indicator needs the pockets of the generation');
  return input.pockets;
}

function fatesOf({ input }: IndicatorContext): Fates {
  if (!input.fates) throw new Error('this indicator needs the fates of frustrated households');
  return input.fates;
}

function causesOfContext({ input }: IndicatorContext): Causes {
  if (!input.causes) throw new Error('this indicator needs the causes of frustration');
  return input.causes;
}

function localShare({ cause }: Causes): number {
  let local = 0;
  for (let i = 0; i < cause.length; i++) if (cause[i] === 1) local++;
  return local / cause.length;
}

function logsOfParent(context: IndicatorContext): Float64Array {
  const { wealth, logWealth } = parentOf(context);
  if (logWealth !== undefined) return logWealth;
  const out = new Float64Array(wealth.length);
  for (let i = 0; i < out.length; i++) out[i] = log(wealth[i]);
  return out;
}

/**
 * All indicators of one generation.
 *
 * @returns one value per entry of `INDICATORS`, in that order; NaN = missing. Cost O(n log n + ties).
 */
export function indicatorRow(context: IndicatorContext): Float64Array {
  const { input } = context;
  const row = new Float64Array(INDICATORS.length);
  for (let k = 0; k < row.length; k++) {
    const { needs, of } = INDICATORS[k];
    const missing =
      (input.decision === null && needs.includes('decision')) ||
      (input.parent === null && needs.includes('parent')) ||
      (!input.pockets && needs.includes('pockets')) ||
      (!input.causes && needs.includes('causes')) ||
      (!input.fates && needs.includes('fates'));
    row[k] = missing ? NaN : of(context);
  }
  return row;
}
