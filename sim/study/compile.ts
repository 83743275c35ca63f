/**
 * From an arm's settings, in the words of the study file, to the engine's model and households.
 */
import { exp } from '../../network/elementary.js';
import type { Households, Milestone, Model, Preferences, Technology } from '../model/types.js';
import { overridePreferences } from './check.js';
import { type ArmSettings, armSettings, type Study, withCurvature } from './complete.js';
import type { Population } from './population.js';
import type { ArmFile, PreferencesFile } from './schema.js';

/** The engine's model of an arm. @param groupNames - in the order of group indices */
export function compileModel(study: Study, arm: ArmFile, groupNames: readonly string[]): Model {
  const settings = armSettings(study, arm);
  return {
    technology: technology(settings),
    shock: {
      sdLog: settings.shock.sd_log,
      sharedByPlace: settings.shock.shared_by_place,
      risk: settings.shock.risk,
    },
    preferences: groupNames.map((name) => enginePreferences(groupPreferences(study, settings, name))),
    milestones: settings.reference.milestones.map(
      (milestone): Milestone => ({
        weight: milestone.weight,
        scale: milestone.scale,
        mix: milestone.mix.map((part) => ({
          from: part.from,
          statistic: part.statistic,
          weight: part.weight,
          q: part.q ?? 0.5,
          window: part.window ?? 1,
        })),
      }),
    ),
    persistence: settings.reference.persistence,
  };
}

/** Households of an arm: the replicate's, with child weights as the arm's preferences give them. */
export function compileHouseholds(study: Study, arm: ArmFile, population: Population): Households {
  const settings = armSettings(study, arm);
  const { n, place, group } = population.labels;
  const byGroup = population.groupNames.map((name) => groupPreferences(study, settings, name));
  const childWeight = new Float64Array(n);
  for (let i = 0; i < n; i++) {
    const own = byGroup[group[i]]!;
    const spread = own.child_weight_spread;
    childWeight[i] = spread === 0 ? own.child_weight : own.child_weight * exp(spread * population.tasteDraw[i]);
  }
  return { n, place, places: population.places, group, groups: population.groupNames.length, childWeight };
}

function groupPreferences(study: Study, settings: ArmSettings, name: string): PreferencesFile {
  const group = study.population.groups?.find((candidate) => candidate.name === name);
  return withCurvature(overridePreferences(settings.preferences, group?.preferences));
}

function technology(settings: ArmSettings): Technology {
  const file = settings.technology;
  return file.kind === 'linear'
    ? { kind: 'linear', grossReturn: file.gross_return }
    : { kind: 'concave', scale: file.scale, elasticity: file.elasticity, depreciation: file.depreciation };
}

function enginePreferences(file: PreferencesFile): Preferences {
  const threshold = file.milestone_shape === 'threshold';
  if (threshold ? file.milestone_curvature === undefined : file.loss_aversion === undefined) {
    throw new Error('preferences without the number their milestone shape needs: check.ts lets none pass');
  }
  return {
    curvature: file.curvature,
    childWeight: file.child_weight,
    milestoneShape: file.milestone_shape,
    // a shape's unused number is set to one that cannot matter
    milestoneCurvature: file.milestone_curvature ?? 0.5,
    lossAversion: file.loss_aversion ?? 1,
  };
}
