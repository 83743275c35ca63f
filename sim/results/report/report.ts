/**
 * `report.html`: a results folder told on one page that can be sent: the question, the answer, figures, tables, the model,
 * cautions, how to run it again and cite it.
 *
 * Text in, text out: the same folder gives the same bytes. What is in the sections is in the other files here.
 */
import type { Study } from '../../study/complete.js';
import type { Answer } from '../answer.js';
import { safe } from '../figures/figure.js';
import type { Results } from '../read.js';
import { estimatesSection } from './estimates.js';
import { type Evidence, gather } from './evidence.js';
import { findings, type Section } from './findings.js';
import { modelSection } from './model.js';
import { page } from './page.js';
import { tablesSection } from './tables.js';
import { bullets, count, list, num, p, table, typographic } from './words.js';

/** Sentences of the answer in large type, at most: those before the ones on pockets. */
const FIRST = 2;

/** Said besides the answer's own cautions. */
const MICRODATA =
  'Survey microdata stay on the machine of those who may use them; names and identifiers do not belong in the files of a study.';

/**
 * The report of a results folder.
 *
 * @param results - the open folder; of its panel, one replicate is read
 * @param notes - the run's notes, when the manifest does not hold them yet (while the folder is being finished)
 * @returns one self-contained HTML page
 */
export async function reportHtml(results: Results, notes?: Readonly<Record<string, unknown>>): Promise<string> {
  const e = await gather(results, notes);
  const { study, manifest, answer } = e;
  const sections: Section[] = [
    { id: 'answer', title: 'The answer in figures', html: answerSection(answer, study) },
    ...findings(e),
  ];
  if (e.estimates !== null) {
    sections.push({
      id: 'estimates',
      title: 'Regressions',
      html: estimatesSection(e.estimates, manifest.arms),
    });
  }
  sections.push(
    { id: 'tables', title: 'Tables', html: tablesSection(e) },
    { id: 'model', title: 'The model', html: modelSection(study, manifest.households) },
    { id: 'assumptions', title: 'Assumptions and cautions', html: assumptions(e) },
    { id: 'rerun', title: 'Run it again, cite it', html: rerun(e) },
  );
  return page({
    title: `${study.study}: report`,
    description: [answer.question, ...answer.words].join(' '),
    version: manifest.version,
    head: head(e),
    sections,
    foot: p(
      `Rungsight ${manifest.version} · study ${manifest.study_hash.slice(0, 12)} · seed ${manifest.seed} · ${count(manifest.replicates, 'replicate')}`,
    ),
  });
}

function head(e: Evidence): string {
  const { answer, study } = e;
  const pockets = answer.words.findIndex((words) => words.includes('pocket'));
  const first = Math.max(1, Math.min(FIRST, pockets < 0 ? FIRST : pockets));
  return (
    p('Report on a simulated study', 'kicker') +
    `<h1>${safe(study.study)}</h1>` +
    p(typographic(answer.question), 'question') +
    p(typographic(answer.words.slice(0, first).join(' ')), 'answer') +
    (answer.words.length > first ? p(typographic(answer.words.slice(first).join(' '))) : '') +
    p(answer.setting, 'setting') +
    `<div class="caution">${answer.cautions.map((line) => p(line)).join('')}</div>`
  );
}

function answerSection(answer: Answer, study: Study): string {
  const arms = study.arms.length;
  return (
    `<div class="answers">${table(
      'Means over replicates',
      ['', ...answer.arms],
      answer.lines.map((line) => [line.label, ...line.cells]),
    )}</div>` +
    '<h3>Words used</h3>' +
    bullets([
      'An aspiration is the wealth a family hopes its child will reach. It is formed from the wealth of those the family looks to.',
      'A family is frustrated when the best plan it can make does not reach what it aspires to. It then invests as if it had no aspiration at all. A satisfied family plans to reach it, and invests more to do so.',
      'A generation is one decision; its outcome is the wealth of the next.',
      ...(arms > 1
        ? [
            'Arms are the cases compared. Every arm has the same families with the same luck; what differs between arms causes the difference in outcome.',
          ]
        : []),
      'A replicate is the whole society drawn anew. An interval says how far chance in the draws leaves the number open; it says nothing of whether the model is right.',
    ])
  );
}

function assumptions(e: Evidence): string {
  const { study, answer } = e;
  const looks = new Set(
    study.reference.milestones.flatMap((milestone) =>
      milestone.mix.filter((part) => part.statistic === 'upward_mean').map((part) => part.from),
    ),
  );
  return (
    p('The results follow from these assumptions; where they do not fit a place, neither do the results.') +
    bullets([
      'Families care about consumption, their child’s wealth, and reaching milestones; they choose the best plan and keep to it.',
      'Nobody borrows: investment in a child comes out of the parent’s wealth.',
      'Each family has one child; nobody moves, marries across families or changes group.',
      ...(looks.size > 0 ? ['Families look up, not down: those richer than themselves form their aspirations.'] : []),
      'Ties stay as they are for all generations' +
        (study.arms.length > 1 ? '; arms differ only in what is stated under Submodels and Initialization.' : '.'),
      'Prices, wages and returns do not react to what families do.',
      `Numbers such as the child weight or the size of milestones are the study’s own choices (seed ${study.seed}), not estimates for a real place, unless its authors say so.`,
    ]) +
    '<h3>Cautions</h3>' +
    bullets([...answer.cautions, MICRODATA])
  );
}

function rerun(e: Evidence): string {
  const { manifest, study } = e;
  const replicates = count(manifest.replicates, 'replicate');
  return (
    p(
      'The folder holds study.yaml, the study with every default written out. The same version gives the same numbers to the last digit, on any machine and with any number of threads:',
    ) +
    '<pre><code>rungsight run study.yaml --out again</code></pre>' +
    table(
      'What was run',
      ['', ''],
      [
        ['program', `Rungsight ${manifest.version}`],
        ['study', manifest.study],
        ['study hash (SHA-256)', manifest.study_hash],
        ['seed', manifest.seed],
        ['arms', list(manifest.arms)],
        ['size', `${num(manifest.households)} households, ${manifest.generations} generations, ${replicates}`],
      ],
      { words: [1] },
    ) +
    p('To cite:') +
    `<blockquote>${p(
      `The Rungsight developers. Rungsight: aspirations, social networks and local aspiration traps, version ${manifest.version}. ` +
        `Study “${study.study}”, seed ${manifest.seed}, ${replicates}, study hash ${manifest.study_hash.slice(0, 16)}.`,
    )}</blockquote>` +
    '<h3>Methods named in this report</h3>' +
    bullets([
      'Cliff and Ord (1981), Spatial Processes: join counts, Moran’s I.',
      'Grimm et al. (2006, 2010), Ecological Modelling; Grimm et al. (2020), Journal of Artificial Societies and Social Simulation: the ODD protocol.',
      'Krackhardt and Stern (1988), Social Psychology Quarterly: the E–I index.',
      'Maslov and Sneppen (2002), Science: degree-preserving swaps.',
      'Newman (2003), Physical Review E: assortativity.',
      'Salmon et al. (2011), SC11: the counter-based random numbers (Philox).',
    ])
  );
}
