/**
 * `report`: writes the report of a results folder anew.
 */
import { renameSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import type { Command } from 'commander';
import { addFiles } from '../results/folder.js';
import { openResults } from '../results/open.js';
import { reportHtml } from '../results/report/report.js';

/** Name of the report in its folder. */
export const REPORT = 'report.html';

interface Options {
  readonly out?: string;
  readonly json?: true;
}

export function reportCommand(program: Command): void {
  program
    .command('report')
    .argument('<folder>', 'results folder of a run')
    .option('--out <file>', 'where to write it (default: report.html in the folder)')
    .option('--json', 'machine-readable result on standard output')
    .summary('write the report of a results folder: one page to read, print or send')
    .description(
      'Writes one self-contained page: the question, the answer, figures, tables, the model, cautions, how to run it\n' +
        'again and cite it. A run writes it by itself; this makes it anew, after regressions for instance.',
    )
    .addHelpText('after', '\nExample:\n  rungsight report results/villages-apart')
    .action(async (folder: string, options: Options) => {
      const file = options.out ?? join(folder, REPORT);
      const html = await reportHtml(await openResults(folder));
      if (options.out === undefined) addFiles(folder, { [REPORT]: html });
      else {
        // under another name first, so that a kill leaves no half file
        writeFileSync(`${file}.writing`, html);
        renameSync(`${file}.writing`, file);
      }
      const bytes = Buffer.byteLength(html);
      if (options.json) console.log(JSON.stringify({ file, bytes }, null, 2));
      else console.log(`${file} (${Math.ceil(bytes / 1024)} KB): open it in a browser, print it or send it.`);
    });
}
