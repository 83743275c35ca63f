/**
 * The library: what `import { … } from 'rungsight'` gives.
 *
 * Every name is documented where it is defined: shapes, units, conventions, errors and source. Nothing here touches
 * files, the network or the clock, and all of it runs in Node and in the browser; the command line adds the files.
 */

// the social graph
export { build, NETWORK_KINDS } from '../network/build/build.js';
export { reached } from '../network/build/reached.js';
export type { NetworkSpec } from '../network/build/spec.js';
// studies
export { InputError, type Problem, RunError, ShapeError } from '../network/errors.js';
export { edgeListText, readEdgeList } from '../network/exchange/edge-list.js';
export { graphmlText, readGraphml } from '../network/exchange/graphml.js';
export { fromGraphology, toGraphology } from '../network/exchange/graphology.js';
export {
  degrees,
  fromPairs,
  hasTie,
  type Labels,
  type Ties,
  tieCount,
  toPairs,
  type Uniform,
} from '../network/graph.js';
export { assortativity, degreeAssortativity, rankAssortativity } from '../network/measure/assortativity.js';
export { betweenness } from '../network/measure/betweenness.js';
export { components, degreeCounts } from '../network/measure/components.js';
export { economicConnectedness } from '../network/measure/economic-connectedness.js';
export { getisOrd } from '../network/measure/getis-ord.js';
export { exposureByPlace, exposureByTies } from '../network/measure/isolation.js';
export { joinCountPermutation, joinCounts } from '../network/measure/join-counts.js';
export { localClustering } from '../network/measure/local-clustering.js';
export { localMoran } from '../network/measure/local-moran.js';
export { localPermutation } from '../network/measure/local-permutation.js';
export {
  coleman,
  colemanByGroup,
  externalInternal,
  groupAssortativity,
  groupTies,
  homophilyByGroup,
  mixingMatrix,
  modularity,
} from '../network/measure/mixing-by-group.js';
export { moran, moranPermutation } from '../network/measure/moran.js';
export { neighbourMeans, secondCircleMeans, weightedNeighbourMeans } from '../network/measure/neighbours.js';
export { secondCircleSizes } from '../network/measure/second-circle.js';
export { networkSummary } from '../network/measure/summary.js';
export { clustering, triangles } from '../network/measure/triangles.js';
export { mix } from '../network/mix/mix.js';
export type { MixResult, MixSpec } from '../network/mix/spec.js';
// frustration, pockets, regimes, contrasts
export { CAUSES, causesOf } from './measure/cause.js';
export { meanOverReplicates, pairedContrast, replicatesNeeded } from './measure/contrast.js';
// polarisation
export { dip, dipPValue, dipTest } from './measure/dip.js';
export { duclosEstebanRay } from './measure/duclos-esteban-ray.js';
// inequality
export {
  atkinson,
  generalisedEntropy2,
  theilL,
  theilLSplit,
  theilT,
  theilTBetween,
  theilTSplit,
} from './measure/entropy.js';
export { estebanRay, estebanRayOfClasses, wealthClasses } from './measure/esteban-ray.js';
export { frustrationRows, meanAspirationGap, shareFrustrated } from './measure/frustration.js';
// mobility and growth
export { gaussianKendall, gaussianRankRankSlope, gaussianTransitions } from './measure/gaussian-mobility.js';
export { gini, giniSmallSample, giniSplit } from './measure/gini.js';
export { growthByInitialRank, growthIncidence } from './measure/incidence.js';
export { INDICATORS, type Indicator, IndicatorContext, indicatorRow } from './measure/indicators.js';
export { lorenz, palma, quantileShares, quintileShareRatio, shareBottom, shareTop } from './measure/lorenz.js';
export {
  elasticity,
  movement,
  rankRankSlope,
  shorrocksEqualisation,
  spearman,
  upwardMobility,
} from './measure/mobility.js';
export { densityModes, gridDensity, silvermanBandwidth } from './measure/modes.js';
export { averageRanks, rankBins, unitRanks } from './measure/order.js';
export { type PocketLife, pocketLives } from './measure/pocket-lives.js';
export { type PocketCensus, PocketTracker, pocketPlan } from './measure/pocket-tracker.js';
export { POCKET_RULE, type PocketRule, ROLES } from './measure/pockets.js';
export { poverty } from './measure/poverty.js';
export { median, p90p10, quantile } from './measure/quantile.js';
export { classifyRegime, observeRegime, REGIMES } from './measure/regime.js';
export { type Sample, sampleOf, type Values, type Weighting } from './measure/sample.js';
export { hoover, mean, variance, varianceBetween, varianceOfLogs } from './measure/spread.js';
export { rowShares, transitionCounts, transitionMeasures } from './measure/transitions.js';
export { wolfson } from './measure/wolfson.js';
// the model
export { type Choice, compileChoice } from './model/choice.js';
export { createEngine, type Engine, makeGeneration } from './model/generation.js';
export type { Generation, Households, Milestone, Model, Part, Preferences, Shock, Technology } from './model/types.js';
export { Draws } from './random/draws.js';
export { philox } from './random/philox.js';
export { stream } from './random/stream.js';
export type { Study } from './study/complete.js';
export { type Inputs, loadInputs, type ReadText, readHouseholds } from './study/inputs.js';
export { type ParsedStudy, parseStudy, studyText } from './study/parse.js';
export type { ArmRecord, GenerationRecord, Recorder } from './study/record.js';
export { type Prepared, simulate } from './study/replicate.js';
export { studyJsonSchema } from './study/schema.js';
export { VERSION } from './version.js';
