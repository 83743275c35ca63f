/** Writes the sample file: `npx tsx test/reference/parquet/write-sample.ts sample.parquet`. */
import { writeFileSync } from 'node:fs';
import { sampleFile } from './sample.js';

writeFileSync(process.argv[2] ?? 'sample.parquet', sampleFile());
