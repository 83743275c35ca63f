/** The study sheet alone on a page, for its tests: `opened` is what the sheet told. */
import { openSheet, type SheetState } from '../../../viewer/sheet/sheet.js';
import { SAMPLE } from '../../viewer/sheet/sample.js';

export interface SheetPage {
  sheet: SheetState;
  told: { readonly event: string; readonly yaml?: string; readonly files?: readonly string[] }[];
  /** Closes the sheet and opens one on the same study. */
  reopen(): void;
  /** Closes the sheet, forgets its edits, and starts over. */
  fresh(): void;
}

const host = document.getElementById('host') as HTMLElement;

function opened(): SheetState {
  const sheet = openSheet(SAMPLE);
  sheet.events = {
    close: () => page.told.push({ event: 'close' }),
    run: (yaml, files) => page.told.push({ event: 'run', yaml, files: [...files.keys()] }),
    save: (yaml) => page.told.push({ event: 'save', yaml }),
    changed: () => {},
  };
  host.append(sheet.element);
  return sheet;
}

const page: SheetPage = {
  sheet: undefined as unknown as SheetState,
  told: [],
  reopen() {
    page.sheet.close();
    page.sheet = opened();
  },
  fresh() {
    page.sheet.open(SAMPLE);
    page.told = [];
    page.reopen();
  },
};
document.documentElement.dataset.theme = new URLSearchParams(location.search).get('theme') ?? 'light';
host.style.setProperty('height', '100dvh');
page.sheet = opened();
(window as unknown as { page: SheetPage }).page = page;
