/** The study sheet alone on a page, for its tests: `opened` is what the sheet told. */
import { openSheet, type SheetState } from '../../../viewer/sheet/sheet.js';
import { SAMPLE } from '../../viewer/sheet/sample.js';

export interface SheetPage {
  readonly sheet: SheetState;
  readonly told: { readonly event: string; readonly yaml?: string; readonly files?: readonly string[] }[];
}

const told: SheetPage['told'] = [];
const sheet = openSheet(SAMPLE);
sheet.events = {
  close: () => told.push({ event: 'close' }),
  run: (yaml, files) => told.push({ event: 'run', yaml, files: [...files.keys()] }),
  save: (yaml) => told.push({ event: 'save', yaml }),
  changed: () => {},
};
document.documentElement.dataset.theme = new URLSearchParams(location.search).get('theme') ?? 'light';
const host = document.getElementById('host') as HTMLElement;
host.style.setProperty('height', '100dvh');
host.append(sheet.element);
(window as unknown as { page: SheetPage }).page = { sheet, told };
