/**
 * Draws the invented survey of the preset `valley-survey`: its households and their ties, the same every time.
 *
 * Wealth falls with distance to the market and rises with schooling; the hill group owns less; ties stay mostly in the
 * village, prefer the own group and similar wealth. Written to presets/ by
 * `npx tsx test/survey/valley-survey.ts`; presets.test.ts checks that the files are what is drawn here.
 */
import { writeFileSync } from 'node:fs';
import { fileURLToPath } from 'node:url';
import { exp, log } from '../../network/elementary.js';
import { normalQuantile } from '../../sim/random/normal.js';
import { stream } from '../../sim/random/stream.js';

/** Invented villages, with the distance to the market in km and the number of households surveyed. */
const VILLAGES = [
  ['Weirhead', 1, 44],
  ['Lower Lanth', 3, 39],
  ['Upper Lanth', 5, 35],
  ['Thistow', 6, 41],
  ['Kelvane', 8, 33],
  ['Ostrel', 9, 36],
  ['Pellowin', 12, 30],
  ['Marrowford', 14, 38],
  ['Sorrindel', 17, 28],
  ['Draskel', 19, 31],
  ['Hollincross', 23, 26],
  ['Quarrend', 28, 24],
] as const;

/** A tie in another village has this share of the odds of one in the own. */
const AFAR = 0.003;
/** And one with the other group this share of the odds of one with the own. */
const OTHER_GROUP = 0.3;

export function drawSurvey(): { households: string; ties: string } {
  const uniform = stream('valley survey', 0, 'households');
  const normal = (): number => normalQuantile((uniform() * 4294967296 + 0.5) / 4294967297);
  const people: { id: string; village: number; hill: boolean; logWealth: number; isolate: boolean; warmth: number }[] =
    [];
  const rows = ['household,wealth,place,group,x_head_age,x_schooling_years,x_market_distance_km,x_female_head'];
  VILLAGES.forEach(([name, distance, count], village) => {
    const luck = 0.3 * normal();
    for (let h = 0; h < count; h++) {
      const hill = uniform() < 0.12 + 0.022 * distance;
      const age = Math.round(Math.min(82, Math.max(21, 46 + 13 * normal())));
      const female = uniform() < 0.19;
      const schooling = Math.round(
        Math.min(15, Math.max(0, 7.5 - 0.07 * (age - 46) - 0.1 * distance - (hill ? 1.5 : 0) + 2.8 * normal())),
      );
      const wealth =
        Math.round(
          10 *
            exp(
              3 -
                0.02 * distance -
                (hill ? 0.45 : 0) +
                0.06 * (schooling - 6) -
                (female ? 0.2 : 0) +
                luck +
                0.45 * normal(),
            ),
        ) / 10;
      const id = `${name.slice(0, 2).toUpperCase()}${village + 1}-${String(h + 1).padStart(2, '0')}`;
      // a few heads did not say how long they went to school
      const said = uniform() < 0.98 ? String(schooling) : '';
      const km = Math.round(10 * Math.max(0.2, distance + 0.6 * normal())) / 10;
      rows.push(`${id},${wealth},${name},${hill ? 'hill' : 'river'},${age},${said},${km},${female ? 1 : 0}`);
      people.push({
        id,
        village,
        hill,
        logWealth: log(wealth),
        isolate: uniform() < 0.02,
        warmth: exp(0.4 * normal()),
      });
    }
  });
  const links = ['source,target'];
  people.forEach((a, i) => {
    people.slice(i + 1).forEach((b) => {
      const apart = Math.abs(a.logWealth - b.logWealth);
      const odds =
        (17 / VILLAGES[a.village]![2]) *
        a.warmth *
        b.warmth *
        (a.village === b.village ? 1 : AFAR) *
        (a.hill === b.hill ? 1 : OTHER_GROUP) *
        exp(-1.2 * apart);
      if (uniform() < odds / (1 + odds) && !a.isolate && !b.isolate) links.push(`${a.id},${b.id}`);
    });
  });
  return { households: `${rows.join('\n')}\n`, ties: `${links.join('\n')}\n` };
}

if (process.argv[1] === fileURLToPath(import.meta.url)) {
  const { households, ties } = drawSurvey();
  const preset = (file: string): string => fileURLToPath(new URL(`../../presets/${file}`, import.meta.url));
  writeFileSync(preset('valley-survey-households.csv'), households);
  writeFileSync(preset('valley-survey-ties.csv'), ties);
}
