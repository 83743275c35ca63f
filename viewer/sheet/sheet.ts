/**
 * The study sheet: plain questions beside the YAML of the same study, either side editing the other.
 *
 * The text of the editor is the study; the form is drawn from it after every change and edits it in place. The
 * sheet draws itself into its own element, so a screen only has to put it into a dialog. Running and saving are the
 * screen's.
 */
import './sheet.css';
import { html, nothing, render, type TemplateResult } from 'lit-html';
import { InputError, type Problem } from '../../network/errors.js';
import { filesOf, loadInputs } from '../../sim/study/inputs.js';
import { pathText } from '../../sim/study/problems.js';
import { StudyFile } from '../../sim/study/schema.js';
import { MOST_BYTES, memoryWords, needs } from '../run/needs.js';
import { plural } from '../screen/words.js';
import { BUILT_IN, builtInFiles } from './built-in.js';
import { type Draft, draftOf, type Fault, faultsOf, faultsWithin, pathAt, spotOf } from './draft.js';
import { type KeyOrder, type Path, setValue, UnreadableYaml, valueAt } from './edit.js';
import { YamlEditor } from './editor.js';
import { type Field, fieldAt, fieldOf, type GroupField } from './fields.js';
import { controlId, type FormContext, fieldsTemplate, fieldTemplate, keyOrder } from './form.js';
import { type Origin, originOf, otherSpread, turnOrigin } from './population.js';
import { type Reading, ROLE_WORDS, readingOf } from './reading.js';
import { QUESTIONS, type Question } from './words.js';

export interface SheetEvents {
  close(): void;
  /** The study is whole, its files read. */
  run(yaml: string, files: Map<string, Uint8Array>): void;
  /** The text as it stands, whether or not it is right. */
  save(yaml: string): void;
  changed(): void;
}

/** A sheet that is open. */
export interface SheetState {
  readonly element: HTMLElement;
  /** The text as it stands. */
  readonly yaml: string;
  /** Files dropped in, by the name the study uses. */
  readonly files: Map<string, Uint8Array>;
  /** True when the text differs from the one the sheet was opened with. */
  readonly edited: boolean;
  /** Replaces the study by another; undo brings the old one back. */
  open(yaml: string, files?: ReadonlyMap<string, Uint8Array>): void;
  /** Shows problems that only a run finds (a network that cannot be built …). */
  report(problems: readonly Problem[]): void;
  events: SheetEvents;
  /** Frees the editor. */
  close(): void;
}

/** Edits of sheets that were closed without running, by the study they were opened on: closing loses nothing. */
const unfinished = new Map<string, { readonly yaml: string; readonly files: ReadonlyMap<string, Uint8Array> }>();

/** Milliseconds without a keystroke after which files are read again. */
const PAUSE = 250;

const IDLE: SheetEvents = { close: () => {}, run: () => {}, save: () => {}, changed: () => {} };

/** Opens a sheet on a study's text. */
export function openSheet(yaml: string, files: ReadonlyMap<string, Uint8Array> = new Map()): SheetState {
  return new Sheet(yaml, files);
}

/** The sheet in a template of the screen. */
export function studySheet(state: SheetState, events: SheetEvents): TemplateResult {
  state.events = events;
  return html`${state.element}`;
}

class Sheet implements SheetState {
  readonly element: HTMLElement;
  readonly files: Map<string, Uint8Array>;
  events: SheetEvents = IDLE;
  readonly #root: GroupField;
  readonly #order: KeyOrder;
  readonly #editor: YamlEditor;
  #first: string;
  #draft: Draft;
  /** Problems of files, which come later than those of the text. */
  #later: readonly Fault[] = [];
  /** Problems of a run, until the next edit. */
  #reported: readonly Fault[] = [];
  #readings: readonly Reading[] = [];
  #at: Path | null = null;
  #said = '';
  #dropping = false;
  /** Counts readings, so that a slower one does not overtake. */
  #reading = 0;
  #pause = 0;
  readonly #decoded = new WeakMap<Uint8Array, string | null>();
  /** What was read last, and whether nothing was wrong with it. */
  #read: { readonly way: string; readonly files: readonly Uint8Array[]; readonly right: boolean } = {
    way: '',
    files: [],
    right: false,
  };

  constructor(yaml: string, files: ReadonlyMap<string, Uint8Array>) {
    this.files = new Map(files);
    this.#first = yaml;
    const root = fieldOf(StudyFile);
    if (root.kind !== 'group') throw new Error('the study schema is not a group of settings');
    this.#root = root;
    this.#order = keyOrder(root, () => this.#draft.raw);
    this.#draft = draftOf(yaml);
    this.#editor = new YamlEditor(yaml, {
      changed: (text) => this.#changed(text),
      moved: (offset) => this.#moved(offset),
      explain: (offset) => this.#explain(offset),
    });
    this.element = document.createElement('div');
    this.element.className = 'study-sheet';
    this.element.addEventListener('keydown', (event) => this.#key(event));
    this.element.addEventListener('focusin', (event) => this.#focused(event));
    for (const kind of ['dragenter', 'dragover', 'dragleave', 'drop'] as const) {
      this.element.addEventListener(kind, (event) => this.#drag(event));
    }
    this.#editor.show(this.#draft.faults);
    const left = unfinished.get(yaml);
    if (left !== undefined) {
      for (const [name, bytes] of left.files) this.files.set(name, bytes);
      // as an edit, so that undo leads back to the study as it was opened
      this.#editor.replace(left.yaml);
    }
    this.#render();
    this.#readFiles();
  }

  get yaml(): string {
    return this.#editor.text;
  }

  get edited(): boolean {
    return this.yaml !== this.#first;
  }

  open(yaml: string, files: ReadonlyMap<string, Uint8Array> = new Map()): void {
    for (const [name, bytes] of files) this.files.set(name, bytes);
    this.#editor.replace(yaml);
    this.#first = yaml;
    this.#at = null;
    this.#editor.mark(null);
    this.#readFiles();
    this.#render();
  }

  report(problems: readonly Problem[]): void {
    this.#reported = faultsOf(this.#draft, problems);
    this.#editor.show(this.#faults);
    this.#render();
  }

  close(): void {
    clearTimeout(this.#pause);
    this.#reading++;
    if (this.edited) unfinished.set(this.#first, { yaml: this.yaml, files: this.files });
    else unfinished.delete(this.#first);
    this.#editor.close();
    this.element.remove();
  }

  get #faults(): readonly Fault[] {
    return [...this.#draft.faults, ...this.#later, ...this.#reported];
  }

  #changed(text: string): void {
    this.#draft = draftOf(text, this.#draft);
    this.#later = [];
    this.#reported = [];
    this.#editor.show(this.#draft.faults);
    this.#said = '';
    this.#readSoon();
    this.#render();
    this.events.changed();
  }

  #edit(change: (text: string) => string, then?: Path): void {
    try {
      this.#editor.replace(change(this.#editor.text));
    } catch (error) {
      if (!(error instanceof UnreadableYaml)) throw error;
      this.#said = `This cannot be changed from here: ${error.message}.`;
      this.#render();
      return;
    }
    if (then !== undefined) this.#goTo(then);
  }

  /** Puts the keyboard on a setting's control. */
  #goTo(path: Path): void {
    for (let length = path.length; length > 0; length--) {
      const control = this.element.querySelector<HTMLElement>(`#${CSS.escape(controlId(path.slice(0, length)))}`);
      if (control === null) continue;
      control.focus();
      control.scrollIntoView({ block: 'nearest' });
      if (control instanceof HTMLInputElement && control.type === 'text') control.select();
      return;
    }
  }

  /** The cursor moved in the text: the form shows the setting there. */
  #moved(offset: number): void {
    const path = pathAt(this.#draft, offset);
    this.#at = path;
    this.#editor.mark(null);
    this.#render();
    if (path === null) return;
    for (let length = path.length; length > 0; length--) {
      const wanted = pathText(path.slice(0, length));
      const found = this.element.querySelector(`.form [data-path="${CSS.escape(wanted)}"]`);
      if (found === null) continue;
      found.scrollIntoView({ block: 'nearest' });
      return;
    }
  }

  /** The keyboard is on a control: the text shows its lines. */
  #focused(event: FocusEvent): void {
    const target = event.target as Element;
    if (target.closest('.form') === null) return;
    const id = target.id;
    const path = id.startsWith('set-') ? this.#pathOf(id) : null;
    this.#at = null;
    const spot = path === null ? null : spotOf(this.#draft, path);
    const whole = spot !== null && path !== null && pathText(spot.path) === pathText(path);
    this.#editor.mark(spot === null ? null : { from: spot.from, to: whole ? spot.to : spot.from });
    for (const row of this.element.querySelectorAll('.form .at')) row.classList.remove('at');
  }

  #pathOf(id: string): Path {
    return id
      .slice('set-'.length)
      .replace(/-value$/, '')
      .split('-')
      .map((step) => (/^\d+$/.test(step) ? Number(step) : step));
  }

  #explain(offset: number): Field | null {
    const path = pathAt(this.#draft, offset);
    return path === null ? null : fieldAt(this.#root, path, this.#draft.raw);
  }

  #key(event: KeyboardEvent): void {
    const inEditor = event.composedPath().includes(this.#editor.element);
    if (!(event.ctrlKey || event.metaKey) || inEditor) return;
    const key = event.key.toLowerCase();
    if (key === 'z' || key === 'y') {
      // one history for both sides: an input's own would undo what the text no longer says
      event.preventDefault();
      if (key === 'y' || event.shiftKey) this.#editor.redo();
      else this.#editor.undo();
    }
  }

  // ── files ─────────────────────────────────────────────────────────────────────────────────────

  #drag(event: DragEvent): void {
    if (!event.dataTransfer?.types.includes('Files')) return;
    event.preventDefault();
    event.stopPropagation();
    if (event.type === 'drop') {
      this.#dropping = false;
      void this.take([...event.dataTransfer.files]);
    } else {
      const leaves = event.type === 'dragleave' && !this.element.contains(event.relatedTarget as Node | null);
      if (this.#dropping === !leaves) return;
      this.#dropping = !leaves;
    }
    this.#render();
  }

  /** Takes files that were dropped or chosen: a study replaces the text, others are kept under their name. */
  async take(files: readonly File[]): Promise<void> {
    for (const file of files) {
      const bytes = new Uint8Array(await file.arrayBuffer());
      if (/\.ya?ml$/i.test(file.name)) this.open(new TextDecoder().decode(bytes));
      else this.files.set(file.name, bytes);
    }
    this.#readFiles();
    this.#render();
    this.events.changed();
  }

  /** Text of the files at hand that are text, decoded once. */
  #texts(): Map<string, string> {
    const texts = new Map<string, string>();
    for (const [name, bytes] of this.files) {
      let text = this.#decoded.get(bytes);
      if (text === undefined) {
        try {
          text = new TextDecoder('utf-8', { fatal: true }).decode(bytes);
        } catch {
          // said as a problem of the file
          text = null;
        }
        this.#decoded.set(bytes, text);
      }
      if (text !== null) texts.set(name, text);
    }
    return texts;
  }

  /** What of the study decides how its files are read; the files themselves by their place in `#decoded`. */
  #wayOfReading(): string {
    const { study } = this.#draft;
    if (study === null) return 'no study';
    const { households, households_file, wealth, groups } = study.population;
    return JSON.stringify([
      households,
      households_file,
      wealth?.sample,
      groups?.map(({ name }) => name),
      study.arms.map(({ network }) => network),
    ]);
  }

  /** Reads the files again once the writer pauses: a large one takes longer than a keystroke. */
  #readSoon(): void {
    clearTimeout(this.#pause);
    if (this.files.size === 0 && this.#readings.length === 0) this.#readFiles();
    else this.#pause = window.setTimeout(() => this.#readFiles(), PAUSE);
  }

  /** Reads every file at hand; those the study names also as a run would, so that all its problems show. */
  #readFiles(): void {
    clearTimeout(this.#pause);
    const { study, parsed } = this.#draft;
    const way = this.#wayOfReading();
    const files = [...this.files.values()];
    const same = way === this.#read.way && files.every((bytes, k) => bytes === this.#read.files[k]);
    // positions in the text move with every edit, so problems are found anew
    if (same && files.length === this.#read.files.length && this.#read.right) return;
    this.#read = { way, files, right: false };
    const texts = this.#texts();
    this.#readings = [...this.files.keys()].map((name) => {
      const text = texts.get(name);
      if (text !== undefined) return readingOf(name, text, study, texts);
      const problem: Problem = {
        code: 'not-utf8',
        place: name,
        problem: 'this is not UTF-8 text',
        remedy: 'save it as UTF-8 (in a spreadsheet: "CSV UTF-8")',
      };
      return { name, role: 'unknown', used: false, facts: [], problems: [problem] };
    });
    this.#render();
    const turn = ++this.#reading;
    if (parsed === null || filesOf(parsed.study).length === 0) return;
    const later = (problems: readonly Problem[]): void => {
      if (turn !== this.#reading) return;
      this.#read = { ...this.#read, right: problems.length === 0 };
      this.#later = faultsOf(this.#draft, problems);
      this.#editor.show(this.#faults);
      this.#render();
    };
    loadInputs(parsed, async (path) => texts.get(path) ?? null).then(
      () => later([]),
      (error: unknown) => {
        if (!(error instanceof InputError)) throw error;
        later(error.problems);
      },
    );
  }

  /** Makes the study use a file at hand. */
  #use(reading: Reading, arm: number): void {
    const { raw } = this.#draft;
    if (reading.role === 'households') {
      this.#edit((text) => turnOrigin(text, raw, 'file', reading.name, this.#order));
    } else if (reading.role === 'ties') {
      this.#edit((text) => setValue(text, ['arms', arm, 'network'], { kind: 'file', path: reading.name }, this.#order));
    } else if (reading.role === 'survey') {
      this.#edit((text) =>
        setValue(
          text,
          ['population', 'wealth'],
          { shape: 'sample', sample: { file: reading.name, column: this.#firstNumber(reading.name) } },
          this.#order,
        ),
      );
    }
    this.#readFiles();
  }

  /** Column names of a table at hand. */
  #header(name: string): string[] | null {
    const text = this.#texts().get(name);
    if (text === undefined || !/\.csv$/i.test(name)) return null;
    return text
      .replace(/^\uFEFF/, '')
      .split(/\r?\n/, 1)[0]!
      .split(',')
      .map((cell) => cell.trim().replaceAll('"', ''));
  }

  /** A column of a survey file that could be wealth. */
  #firstNumber(name: string): string {
    const header = (this.#texts().get(name) ?? '')
      .split(/\r?\n/, 1)[0]!
      .split(',')
      .map((cell) => cell.trim().replaceAll('"', ''));
    return header.find((cell) => /wealth|asset|income|consumption/i.test(cell)) ?? header.at(-1) ?? 'wealth';
  }

  // ── drawing ───────────────────────────────────────────────────────────────────────────────────

  #render(): void {
    const active = this.element.contains(document.activeElement) ? document.activeElement : null;
    const { raw } = this.#draft;
    const context: FormContext = {
      draft: this.#draft,
      root: this.#root,
      faults: this.#faults,
      active,
      at: this.#at,
      files: [...this.files.keys()],
      order: this.#order,
      edit: (change, then) => this.#edit(change, then),
      words: (path) => this.#words(path),
      other: (path) => otherSpread(path, raw, this.#order),
    };
    render(this.#template(context), this.element);
  }

  /** Names that other parts of the study, or files at hand, give to a setting. */
  #words(path: Path): readonly string[] | null {
    const { raw } = this.#draft;
    const key = path.at(-1);
    if (path[0] === 'arms' && path[2] === 'network' && key === 'from') {
      const arms = valueAt(raw, ['arms']);
      if (!Array.isArray(arms)) return null;
      return arms.map((arm) => String(valueAt(arm, ['name']) ?? '')).filter((name, a) => name !== '' && a !== path[1]);
    }
    if (key === 'column' || key === 'weight') {
      const file = valueAt(raw, [...path.slice(0, -1), 'file']) ?? valueAt(raw, [...path.slice(0, -1), 'path']);
      const header = typeof file === 'string' ? this.#header(file) : null;
      const value = valueAt(raw, path);
      return header === null || (value !== undefined && !header.includes(String(value))) ? null : header;
    }
    return null;
  }

  #template(context: FormContext): TemplateResult {
    return html`
      ${this.#headTemplate()}
      <div class="sheet-body">
        <nav class="questions" aria-label="Questions">
          <ul>
            ${QUESTIONS.map((question) => {
              const wrong = this.#faultsOf(question).length;
              return html`<li>
                <a href=${`#q-${question.id}`} @click=${(event: Event) => this.#toQuestion(event, question)}
                  >${question.short}${wrong > 0 ? html`<span class="count">${wrong}<span class="hidden-text"> ${wrong === 1 ? 'problem' : 'problems'}</span></span>` : nothing}</a
                >
              </li>`;
            })}
          </ul>
        </nav>
        <form class="form" aria-label="The study in questions" @submit=${(event: Event) => event.preventDefault()}>
          ${this.#draft.readable ? nothing : html`<p class="unreadable">The YAML cannot be read at present, so the questions show what it said before. Mend the line marked beside.</p>`}
          ${QUESTIONS.map((question) => this.#question(context, question))}
          <datalist id="sheet-files">${context.files.map((name) => html`<option value=${name}></option>`)}</datalist>
        </form>
        <section class="text-side" aria-label="The same study as YAML">
          <div class="text-head"><span>study.yaml</span>
            <span class="history">
              <button type="button" class="plain" ?disabled=${!this.#editor.canUndo} @click=${() => this.#editor.undo()}>undo</button>
              <button type="button" class="plain" ?disabled=${!this.#editor.canRedo} @click=${() => this.#editor.redo()}>redo</button>
            </span>
          </div>
          ${this.#editor.element}
          ${this.#filesTemplate()}
        </section>
      </div>
      ${this.#footer()}
      ${this.#dropping ? html`<div class="drop-here" aria-hidden="true"><p>Drop a study (.yaml), households or a survey (.csv), or ties (.csv, .graphml)</p></div>` : nothing}
    `;
  }

  #headTemplate(): TemplateResult {
    const title = valueAt(this.#draft.raw, ['study']);
    const whole = this.#faults.length === 0;
    return html`<header class="sheet-head">
      <div class="sheet-title">
        <h2 id="sheet-title" tabindex="-1" autofocus>Study</h2>
        <span class="sheet-name">${typeof title === 'string' || typeof title === 'number' ? title : ''}${this.edited ? html` <span class="edited">edited</span>` : nothing}</span>
      </div>
      <div class="sheet-actions">
        <label class="choice"><span class="says">start from</span>
          <select class="quiet" @change=${(event: Event) => void this.#startFrom(event.target as HTMLSelectElement)}>
            <option value="" selected>a built-in study …</option>
            ${BUILT_IN.map(({ name, title: said }) => html`<option value=${name}>${said}</option>`)}
          </select></label>
        <button type="button" class="button" @click=${() => this.#choose('.yaml,.yml')}>Open…</button>
        <button type="button" class="button" @click=${() => this.events.save(this.yaml)}>Save study</button>
        <button type="button" class="button main" aria-describedby="sheet-state" ?disabled=${!whole} @click=${() => this.#run()}>Run</button>
        <button type="button" class="button" @click=${() => this.events.close()}>Close</button>
      </div>
      <input type="file" class="file-input hidden-text" tabindex="-1" aria-hidden="true" multiple @change=${(
        event: Event,
      ) => {
        const input = event.target as HTMLInputElement;
        void this.take([...(input.files ?? [])]);
        input.value = '';
      }} />
    </header>`;
  }

  #choose(accept: string): void {
    const input = this.element.querySelector('.file-input') as HTMLInputElement;
    input.accept = accept;
    input.click();
  }

  async #startFrom(select: HTMLSelectElement): Promise<void> {
    const study = BUILT_IN.find(({ name }) => name === select.value);
    select.value = '';
    if (study === undefined) return;
    const files = await builtInFiles(study.text);
    const encoder = new TextEncoder();
    this.open(study.text, new Map([...files].map(([name, text]) => [name, encoder.encode(text)])));
    this.events.changed();
  }

  #run(): void {
    if (this.#faults.length === 0) this.events.run(this.yaml, this.files);
  }

  #toQuestion(event: Event, question: Question): void {
    event.preventDefault();
    const section = this.element.querySelector<HTMLElement>(`#q-${question.id}`);
    section?.scrollIntoView({ block: 'start' });
    section?.querySelector<HTMLElement>('h3')?.focus({ preventScroll: true });
  }

  #faultsOf(question: Question): Fault[] {
    return [...question.keys, ...(question.inText ?? [])].flatMap((key) => faultsWithin(this.#faults, [key]));
  }

  #question(context: FormContext, question: Question): TemplateResult {
    return html`<section class="question" id=${`q-${question.id}`} aria-labelledby=${`h-${question.id}`}>
      <h3 id=${`h-${question.id}`} tabindex="-1">${question.ask}</h3>
      <p class="lead">${question.says}</p>
      ${question.id === 'study' ? this.#wholeStudy(context) : nothing}
      ${question.keys.map((key) => this.#section(context, key))}
      ${(question.inText ?? []).map((key) => this.#inText(key))}
    </section>`;
  }

  /** Problems that no question has a place for. */
  #wholeStudy(context: FormContext): TemplateResult | typeof nothing {
    const known = new Set(QUESTIONS.flatMap(({ keys, inText }) => [...keys, ...(inText ?? [])]));
    const loose = context.faults.filter(
      (fault) => fault.elsewhere === null && (fault.path.length === 0 || !known.has(String(fault.path[0]))),
    );
    if (loose.length === 0 || !this.#draft.readable) return nothing;
    return html`<div class="wrong">${loose.map((fault) => html`<p>${fault.problem}; ${fault.remedy}.</p>`)}</div>`;
  }

  #section(context: FormContext, key: string): unknown {
    const field = this.#root.fields.find((candidate) => candidate.key === key);
    if (field === undefined) return nothing;
    if (key === 'population' && field.kind === 'group') return this.#population(context, field);
    if (key === 'reference' && field.kind === 'group') return fieldsTemplate(context, field.fields, [key], 1);
    return fieldTemplate(context, field, [key], 0);
  }

  /** A section that only the text holds: what it is, how much of it there is, and the way there. */
  #inText(key: string): TemplateResult {
    const note = StudyFile.shape[key as keyof typeof StudyFile.shape].meta() as {
      title?: string;
      description?: string;
    };
    const value = valueAt(this.#draft.raw, [key]);
    const entries = Array.isArray(value) ? value.length : 0;
    const spot = this.#draft.spots.find(({ path }) => path.length === 1 && path[0] === key);
    const faults = faultsWithin(this.#faults, [key]);
    return html`<div class="setting" data-path=${key}>
      <span class="label">${note.title}</span>
      <div class="control">${
        spot === undefined
          ? html`<span class="says">none</span>`
          : html`<button type="button" class="plain act" @click=${() => this.#editor.go(spot.from)}>${entries} in the text</button>`
      }</div>
      <div class="about"><p class="says">${note.description} They are written in the text, under ${key}.</p>
        ${faults.length === 0 ? nothing : html`<div class="wrong">${faults.map((fault) => html`<p>${fault.problem}; ${fault.remedy}.</p>`)}</div>`}</div>
    </div>`;
  }

  #population(context: FormContext, field: GroupField): TemplateResult {
    const { raw } = this.#draft;
    const origin = originOf(raw);
    const names: Readonly<Record<Origin, string>> = { drawn: 'drawn by the study', file: 'read from a file' };
    const file = this.#readings.find((reading) => reading.role === 'households')?.name ?? 'households.csv';
    const takes = (key: string): boolean =>
      origin === 'file' ? key === 'households_file' || key === 'groups' : key !== 'households_file';
    const written = (valueAt(raw, ['population']) ?? {}) as Record<string, unknown>;
    return html`<div class="setting origin">
        <label for="origin">The households are</label>
        <div class="control"><select id="origin" class="quiet" ?disabled=${!this.#draft.readable} .value=${origin}
          @change=${(event: Event) => {
            const to = (event.target as HTMLSelectElement).value as Origin;
            this.#edit((text) => turnOrigin(text, raw, to, file, this.#order));
          }}>
          ${(['drawn', 'file'] as const).map((one) => html`<option value=${one} ?selected=${one === origin}>${names[one]}</option>`)}
        </select></div>
        <div class="about"><p class="says">${
          origin === 'file'
            ? 'Drop the file on this sheet. It stays on this machine; leave names and other identifiers out of it.'
            : 'Places, groups and wealth at the start are drawn as said below; or drop a file of households on this sheet.'
        }</p></div>
      </div>
      ${fieldsTemplate(
        context,
        populationFields(field, origin).filter((inner) => takes(inner.key) || written[inner.key] !== undefined),
        ['population'],
        0,
      )}`;
  }

  #filesTemplate(): TemplateResult {
    const named = this.#draft.study === null ? [] : filesOf(this.#draft.study).map(({ path }) => path);
    const missing = [...new Set(named)].filter((name) => !this.files.has(name));
    return html`<div class="files" role="region" aria-label="Files">
      <div class="text-head"><span>Files</span>
        <button type="button" class="plain" @click=${() => this.#choose('.csv,.graphml,.yaml,.yml')}>add a file…</button></div>
      <div class="file-list">
        ${
          this.#readings.length === 0 && missing.length === 0
            ? html`<p class="says">None. Drop a file of households, a survey or ties anywhere on this sheet.</p>`
            : nothing
        }
        ${missing.map((name) => html`<div class="file"><p class="file-name">${name} <span class="says">named by the study, not here yet</span></p></div>`)}
        ${this.#readings.map((reading) => this.#fileTemplate(reading))}
      </div>
    </div>`;
  }

  #fileTemplate(reading: Reading): TemplateResult {
    const { name, role, used, facts, problems } = reading;
    const arms = valueAt(this.#draft.raw, ['arms']);
    const armNames = Array.isArray(arms) ? arms.map((arm) => String(valueAt(arm, ['name']) ?? '')) : [];
    const usable = !used && problems.length === 0 && this.#draft.readable;
    return html`<div class="file">
      <p class="file-name">${name} <span class="says">${ROLE_WORDS[role]}${used ? '' : ', not used yet'}</span>
        <button type="button" class="plain" aria-label=${`Remove ${name}`} @click=${() => {
          this.files.delete(name);
          this.#readFiles();
          this.#render();
        }}>remove</button></p>
      ${
        facts.length === 0
          ? nothing
          : html`<dl class="facts">${facts.map(({ label, says }) => html`<div><dt>${label}</dt><dd>${says}</dd></div>`)}</dl>`
      }
      ${
        problems.length === 0
          ? nothing
          : html`<ul class="wrong">${problems.slice(0, 12).map((one) => html`<li><span class="place">${one.place}</span> ${one.problem}; ${one.remedy}.</li>`)}
            ${problems.length > 12 ? html`<li>and ${problems.length - 12} more</li>` : nothing}</ul>`
      }
      ${
        !usable
          ? nothing
          : role === 'households'
            ? html`<p><button type="button" class="plain act" @click=${() => this.#use(reading, 0)}>use as the households</button></p>`
            : role === 'survey'
              ? html`<p><button type="button" class="plain act" @click=${() => this.#use(reading, 0)}>draw wealth from it</button></p>`
              : role === 'ties'
                ? html`<p>${armNames.map((arm, a) => html`<button type="button" class="plain act" @click=${() => this.#use(reading, a)}>use as the ties of ${arm}</button> `)}</p>`
                : nothing
      }
    </div>`;
  }

  #footer(): TemplateResult {
    const faults = this.#faults;
    const { study } = this.#draft;
    return html`<footer class="sheet-foot">
      <div id="sheet-state" role="status" aria-live="polite">
        ${
          this.#said !== ''
            ? html`<span class="wrong">${this.#said}</span>`
            : faults.length > 0
              ? html`<span class="wrong">${plural(faults.length, 'problem')}</span>`
              : study === null
                ? nothing
                : html`<span class="right">Ready to run: ${this.#size()}</span>`
        }
      </div>
      ${
        faults.length === 0
          ? nothing
          : html`<ul class="fault-list">
              ${faults.slice(0, 6).map(
                (fault) => html`<li><button type="button" class="plain" @click=${() => this.#show(fault)}>
                  <span class="place">${fault.elsewhere ?? `line ${fault.line}`}</span> ${fault.problem}; ${fault.remedy}
                </button></li>`,
              )}
              ${faults.length > 6 ? html`<li class="says">and ${faults.length - 6} more</li>` : nothing}
            </ul>`
      }
    </footer>`;
  }

  #show(fault: Fault): void {
    if (fault.elsewhere !== null) return;
    const control = this.element.querySelector(`#${CSS.escape(controlId(fault.path))}`);
    control?.scrollIntoView({ block: 'center' });
    this.#editor.go(fault.from);
  }

  #size(): string {
    const { study } = this.#draft;
    if (study === null) return '';
    const file = study.population.households_file;
    const reading = file === undefined ? undefined : this.#readings.find(({ name }) => name === file);
    const n = study.population.households ?? Number.parseInt((reading?.facts[0]?.says ?? '0').replace(/\s/g, ''), 10);
    const { arms, replicates, generations } = study;
    const needed = needs(study, n);
    const more =
      needed.bytes > MOST_BYTES
        ? ', more than a page can hold: keep a part of the panel, or run it by the command line'
        : '';
    return `${plural(n, 'household')}, ${plural(arms.length, 'arm')}, ${plural(replicates, 'replicate')} of ${plural(generations, 'generation')}; ${memoryWords(needed)}${more}.`;
  }
}

/** The population's settings as the origin of the households has them. */
function populationFields(field: GroupField, origin: Origin): Field[] {
  if (origin === 'drawn') {
    // drawn households cannot do without wealth, so it is not offered for removal
    return field.fields.map((inner) => (inner.key === 'wealth' ? { ...inner, optional: false } : inner));
  }
  const [file, others] = [
    field.fields.filter(({ key }) => key === 'households_file'),
    field.fields.filter(({ key }) => key !== 'households_file'),
  ];
  return [...file, ...others.map((inner) => (inner.key === 'groups' ? withoutShares(inner) : inner))];
}

/** A file says who is in a group and what they own. */
function withoutShares(groups: Field): Field {
  if (groups.kind !== 'list' || groups.item.kind !== 'group') return groups;
  const fields = groups.item.fields.filter(({ key }) => key !== 'share' && key !== 'relative_wealth');
  return { ...groups, item: { ...groups.item, fields } };
}
