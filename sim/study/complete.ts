/**
 * A study with every default written out: what runs, what is hashed, and what a results folder keeps.
 *
 * Defaults of single fields are in schema.ts; here are those that depend on another field (milestone
 * curvature, group shares, an arm's own settings). Completing a completed study changes nothing.
 */
import { defined, overridePreferences } from './check.js';
import {
  type ArmFile,
  type PartialPreferencesFile,
  type PreferencesFile,
  type ReferenceFile,
  type ShockFile,
  StudyFile,
  type TechnologyFile,
} from './schema.js';

/** A group with everything filled in; share is absent only when a households file says who is in it. */
export interface Group {
  readonly name: string;
  readonly share?: number;
  readonly relative_wealth?: number;
  readonly preferences?: PartialPreferencesFile;
}

/** A complete study. Valid input again, so its YAML can be run. */
export type Study = Omit<StudyFile, 'seed' | 'population'> & {
  readonly seed: string;
  readonly population: Omit<StudyFile['population'], 'places' | 'groups'> & {
    readonly places?: { readonly count: number; readonly size_cv: number };
    readonly groups?: readonly Group[];
  };
};

/** Fills in every default. @param file - a parsed study that check.ts found nothing wrong with */
export function completeStudy(file: StudyFile): Study {
  const preferences = withCurvature(file.preferences);
  const drawn = file.population.households_file === undefined;
  const { places, groups, ...rest } = file.population;
  const completeGroups: readonly Group[] | undefined = (
    groups ?? (drawn ? [{ name: 'all', share: 1 }] : undefined)
  )?.map((group) => ({
    name: group.name,
    ...(drawn ? { share: group.share ?? 1, relative_wealth: group.relative_wealth ?? 1 } : {}),
    ...(group.preferences === undefined
      ? {}
      : { preferences: completeOverride(file.preferences, preferences, group.preferences) }),
  }));
  const complete = {
    ...file,
    seed: String(file.seed),
    population: {
      ...rest,
      ...(drawn ? { places: typeof places === 'object' ? places : { count: places ?? 1, size_cv: 0 } } : {}),
      ...(completeGroups === undefined ? {} : { groups: completeGroups }),
    },
    preferences,
    arms: file.arms.map((arm) =>
      arm.preferences === undefined
        ? arm
        : { ...arm, preferences: completeOverride(file.preferences, preferences, arm.preferences) },
    ),
  };
  // parsing again puts every key in the schema's order, so that a completed study is written the same way every time
  return StudyFile.parse(complete) as Study;
}

/** Milestone curvature is the curvature unless given. */
export function withCurvature(preferences: PreferencesFile): PreferencesFile {
  if (preferences.milestone_shape !== 'threshold' || preferences.milestone_curvature !== undefined) return preferences;
  return { ...preferences, milestone_curvature: preferences.curvature };
}

/**
 * An override with its dependent default made explicit: once the shared milestone curvature is written out, an
 * override of the curvature alone would otherwise no longer move it.
 */
function completeOverride(
  asWritten: PreferencesFile,
  completed: PreferencesFile,
  over: PartialPreferencesFile,
): PartialPreferencesFile {
  const wanted = withCurvature(overridePreferences(asWritten, over));
  const given = overridePreferences(completed, over);
  if (wanted.milestone_curvature === undefined || wanted.milestone_curvature === given.milestone_curvature) return over;
  return { ...over, milestone_curvature: wanted.milestone_curvature };
}

/** An arm's settings: the study's with the arm's own laid over them. */
export interface ArmSettings {
  readonly technology: TechnologyFile;
  readonly shock: ShockFile;
  readonly preferences: PreferencesFile;
  readonly reference: ReferenceFile;
}

/** Resolves what an arm overrides. */
export function armSettings(study: Study, arm: ArmFile): ArmSettings {
  const over = defined(arm.technology ?? {});
  const kind = over.kind ?? study.technology.kind;
  const base =
    kind === study.technology.kind ? study.technology : { kind, ...(kind === 'concave' ? { depreciation: 1 } : {}) };
  return {
    technology: { ...base, ...over, kind } as TechnologyFile,
    shock: { ...study.shock, ...defined(arm.shock ?? {}) },
    preferences: overridePreferences(study.preferences, arm.preferences),
    reference: { ...study.reference, ...defined(arm.reference ?? {}) },
  };
}
