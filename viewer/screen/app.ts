/**
 * The app: holds the view and the source, loads what the view needs, hands a scene to the stage and texts to the
 * screen. Everything the reader does comes through here.
 */
import { html, nothing, render, type TemplateResult } from 'lit-html';
import type { Problem } from '../../network/errors.js';
import { standalone } from '../../sim/results/figures/figure.js';
import { download, fileName } from '../data/download.js';
import { Loader } from '../data/loader.js';
import { type Cast, numbers, ROLE, type Snapshot, type Source, type Table, text } from '../data/source.js';
import { drawer } from '../drawer/drawer.js';
import { LEVEL } from '../drawer/pockets.js';
import { type Axis, axes } from '../field/arrangement.js';
import { FieldCanvas } from '../field/canvas.js';
import { COLOURINGS, type Colouring, type LegendItem, legend } from '../field/colouring.js';
import { Layouts } from '../field/layouts.js';
import { CAUTION, type PictureTexts, picture } from '../field/picture.js';
import type { ArmScene, Scene, ShownPocket } from '../field/scene.js';
import { reducedMotion, Stage } from '../field/stage.js';
import { type Run, startRun } from '../run/run.js';
import { dataOffers, partialNote } from '../save/offers.js';
import { openSheet, type SheetState, studySheet } from '../sheet/sheet.js';
import { strip } from '../strip/strip.js';
import { guide } from './guide.js';
import { type SaveOffer, saveSheet } from './save.js';
import { type ScreenEvents, screenTemplate } from './screen.js';
import { DARK, LIGHT, type Tokens } from './tokens.js';
import { fromLink, START, toLink, type View } from './view.js';
import { percent, plural } from './words.js';

/** Milliseconds a generation stands while playing, its glide included. */
const DWELL = 1150;

/** How the study shown came to be: what a save and another run need. */
export interface Origin {
  readonly yaml: string;
  readonly files: ReadonlyMap<string, Uint8Array>;
  /** True when a link to this page brings the same study back. */
  readonly linked: boolean;
  /** Address of the study's report, where there is one to go to. */
  readonly report?: string | null;
}

export class App {
  readonly mount: HTMLElement;
  view: View = START;
  loader: Loader;
  stage: Stage | null = null;
  scene: Scene | null = null;
  playing = false;
  /** Field whose arm the Household panel speaks of. */
  side: 0 | 1 = 0;
  /** Counts the sources opened, so that kept values are of the right one. */
  sourceCount = 0;
  /** Size of the drawer's panel in figure units. */
  panelSize = { width: 1180, height: 160 };
  origin: Origin;
  #frustrated: Float64Array[] = [];
  #pockets: Table | null = null;
  #axes: Axis[] = [];
  readonly #layouts: Layouts;
  #turn = 0;
  #timer = 0;
  #dark: boolean;
  #run: Run | null = null;
  #running: { share: number; doing: string } | null = null;
  #message: { says: string; wrong: boolean } | null = null;
  #sheet: SheetState | null = null;
  #saving: { doing: string; trouble: string } | null = null;
  #guide: { step: number; only: boolean } | null = null;

  constructor(mount: HTMLElement, source: Source, origin: Origin) {
    this.mount = mount;
    this.origin = origin;
    this.loader = new Loader(source);
    this.#layouts = new Layouts(() => void this.load());
    const kept = stored('theme');
    this.#dark = kept === null ? matchMedia('(prefers-color-scheme: dark)').matches : kept === 'dark';
    document.documentElement.dataset.theme = this.#dark ? 'dark' : 'light';
    this.view = this.#allowed(fromLink(location.hash, { ...START, replicate: source.info.shown[0] ?? 0 }));
    addEventListener('hashchange', () => {
      if (location.hash.slice(1) !== toLink(this.view)) void this.change(fromLink(location.hash, this.view));
    });
    addEventListener('keydown', (e) => this.#key(e));
  }

  get source(): Source {
    return this.loader.source;
  }

  get tokens(): Tokens {
    return this.#dark ? DARK : LIGHT;
  }

  /** Last generation that can be shown. */
  get reached(): number {
    const { generations, every } = this.source.info;
    return (generations - 1) % every === 0 ? generations : generations - 1 - ((generations - 1) % every);
  }

  async start(): Promise<void> {
    this.render();
    const root = this.mount.querySelector('.stage') as HTMLElement;
    const canvas = await FieldCanvas.open(root.querySelector('canvas') as HTMLCanvasElement);
    this.stage = new Stage(
      root,
      canvas,
      {
        select: (i, field) => {
          this.side = field;
          this.select(i);
        },
      },
      this.tokens,
    );
    new ResizeObserver(() => this.#measurePanel()).observe(this.mount.querySelector('.drawer') as HTMLElement);
    this.#measurePanel();
    this.#caution();
    if (!location.hash.includes('generation=')) await this.#whereArmsPart();
    await this.load();
  }

  /** Starts at the generation in which the two arms differ most: that is what the study is about. */
  async #whereArmsPart(): Promise<void> {
    const { info } = this.source;
    const [left, right] = [this.view.left, this.view.right];
    if (left === right) {
      this.view = this.#allowed({ ...this.view, generation: info.generations - 1 });
      return;
    }
    const shares = sharesOf(
      await this.source.table('indicators'),
      info.arms.map((a) => a.name),
      info.generations,
      this.view.replicate,
    );
    let most = 0;
    for (let t = 0; t < info.generations; t += info.every) {
      const apart = Math.abs(shares[left][t] - shares[right][t]);
      if (apart > most) {
        most = apart;
        this.view = { ...this.view, generation: t };
      }
    }
  }

  /** Shows another study. */
  async open(source: Source, origin: Origin, keepView: boolean): Promise<void> {
    this.loader.source.close();
    this.loader = new Loader(source);
    this.origin = origin;
    this.sourceCount++;
    this.#layouts.clear();
    const view = keepView ? this.view : { ...START, arrangement: this.view.arrangement, tab: this.view.tab };
    this.view = this.#allowed({ ...view, pocket: null });
    if (!keepView) await this.#whereArmsPart();
    await this.load(true);
  }

  /** Changes the view and shows it. */
  async change(patch: Partial<View>, still = false): Promise<void> {
    this.view = this.#allowed({ ...this.view, ...patch });
    const link = `#${toLink(this.view)}`;
    if (location.hash !== link) history.replaceState(null, '', link);
    await this.load(still);
  }

  select(index: number): void {
    const cast = this.scene?.arms[0].cast;
    void this.change({
      household: index < 0 || cast === undefined ? null : cast.id[index],
      ...(index >= 0 ? { tab: 'household' as const } : {}),
    });
  }

  lookAt(side: 0 | 1): void {
    this.side = side;
    this.render();
  }

  /** Picks a pocket of the generation shown and brings it into view. */
  framePocket(field: 0 | 1, id: number): void {
    const arm = this.scene?.arms[field];
    if (arm === undefined) return;
    const members: number[] = [];
    for (let i = 0; i < arm.now.pocket.length; i++)
      if (arm.now.pocket[i] === id && arm.now.role[i] === ROLE.core) members.push(i);
    void this.change({ pocket: { field, id } }).then(() => this.stage?.frameOn(members, field));
  }

  /** Loads what the view needs and shows it; a later call overtakes an earlier one. */
  async load(still = false): Promise<void> {
    const turn = ++this.#turn;
    try {
      const scene = await this.#compose(this.view);
      if (turn !== this.#turn) return;
      this.scene = scene;
      if (this.#message?.wrong === true) this.#message = null;
      this.render();
      this.stage?.show(scene, still);
    } catch (error) {
      if (turn !== this.#turn) return;
      this.#message = { says: error instanceof Error ? error.message : String(error), wrong: true };
      this.render();
    }
  }

  async #compose(view: View): Promise<Scene> {
    const { loader } = this;
    const { info } = this.source;
    const { replicate, generation } = view;
    const arms = [view.left, view.right];
    // one arm has nothing beside it but its own start
    const alone = info.arms.length === 1;
    const before = generation - info.every;
    const tieTime = Math.min(generation, info.generations - 1);
    const [casts, ties, now, earlier, extents, indicators, pockets] = await Promise.all([
      Promise.all(arms.map((a) => loader.cast(a, replicate))),
      Promise.all(arms.map((a) => loader.ties(a, replicate, tieTime))),
      Promise.all(arms.map((a, k) => loader.snapshot(a, replicate, alone && k === 1 ? 0 : generation))),
      Promise.all(
        arms.map((a) =>
          generation > 0
            ? loader.snapshot(a, replicate, generation === info.generations ? generation - 1 : before)
            : null,
        ),
      ),
      Promise.all(arms.map((a) => loader.extents(a, replicate))),
      this.source.table('indicators'),
      this.source.table('pockets'),
    ]);
    this.#frustrated = sharesOf(
      indicators,
      info.arms.map((a) => a.name),
      info.generations,
      replicate,
    );
    this.#pockets = pockets;
    this.#axes = axes(extents);
    const selected = view.household === null ? -1 : casts[0].id.indexOf(view.household);
    const first = await Promise.all(arms.map((a) => loader.snapshot(a, replicate, 0)));
    return {
      generation,
      arms: [0, 1].map((k): ArmScene => {
        const key = `${this.sourceCount}/${arms[k]}/${replicate}`;
        const map = view.arrangement === 'map' ? this.#layouts.map(key, ties[k], casts[k]) : null;
        return {
          name: alone && k === 1 ? `${info.arms[0].name}, at the start` : info.arms[arms[k]].name,
          note: noteOf(info.arms[arms[k]].reached, casts[k], ties[k]),
          cast: casts[k],
          now: now[k],
          earlier: alone && k === 1 ? null : earlier[k],
          ties: ties[k],
          sideways: this.#layouts.sideways(key, ties[k], casts[k], first[k].wealth),
          map: map?.positions ?? null,
          print: map?.print ?? null,
          pockets: pocketsOf(now[k], pockets, info.arms[arms[k]].name, replicate),
        };
      }) as [ArmScene, ArmScene],
      arrangement: view.arrangement,
      colouring: view.colouring,
      tiesShown: view.ties,
      axis: this.#axes[generation] ?? { low: 0, high: 1 },
      selected,
      pocket: [0, 1].map((k) => (view.pocket?.field === k ? view.pocket.id : -1)) as [number, number],
      sidewaysSays: casts[0].places > 1 ? 'places, poorer to richer →' : 'neighbours side by side, poorer to richer →',
      groupNames: info.groupNames,
    };
  }

  play(on = !this.playing): void {
    this.playing = on;
    clearTimeout(this.#timer);
    if (on) {
      const step = async (): Promise<void> => {
        if (!this.playing) return;
        if (this.view.generation >= this.reached) {
          this.playing = false;
          this.render();
          return;
        }
        await this.change({ generation: this.view.generation + this.source.info.every });
        this.#timer = window.setTimeout(step, reducedMotion() ? 1600 : DWELL);
      };
      if (this.view.generation >= this.reached) {
        void this.change({ generation: 0 }, true).then(() => {
          this.#timer = window.setTimeout(step, 500);
        });
      } else void step();
    }
    this.render();
  }

  goTo(generation: number): void {
    this.play(false);
    if (generation !== this.view.generation) void this.change({ generation });
  }

  /** Runs a study in the page; what is shown stays until its first replicate is there. */
  run(yaml: string, files: ReadonlyMap<string, Uint8Array>, linked = false): void {
    this.#run?.cancel();
    this.#running = { share: 0, doing: 'reading the study' };
    this.#message = null;
    let first = true;
    const origin: Origin = { yaml, files, linked };
    this.#run = startRun(
      { yaml, files },
      {
        progress: (share, doing) => this.progress(share, doing),
        arrived: (source, _, whole) => {
          const again = !first;
          first = false;
          if (whole) this.finished();
          void this.open(source, origin, again || linked).then(() => {
            if (!again && !linked) this.#caution();
          });
        },
        problems: (problems) => this.#refused(problems),
        failed: (message) => this.failed(message),
      },
    );
    this.render();
  }

  /** Takes over a run that was started before there was a screen. */
  adopt(run: Run): void {
    this.#run = run;
    this.#running = { share: 0, doing: 'going on with the other replicates' };
    this.render();
  }

  /** How far the run has come. */
  progress(share: number, doing: string): void {
    if (this.#run === null) return;
    this.#running = { share, doing };
    this.render();
  }

  /** The run is over and its results are here. */
  finished(): void {
    this.#running = null;
    this.#run = null;
    this.render();
  }

  failed(message: string): void {
    this.#running = null;
    this.#run = null;
    this.#message = { says: `The run failed: ${message}`, wrong: true };
    this.render();
  }

  #refused(problems: readonly Problem[]): void {
    this.#running = null;
    this.#run = null;
    if (this.#sheet === null) this.#openSheet();
    this.#sheet?.report(problems);
    this.#message = { says: `The study cannot run: ${problems[0]?.problem ?? ''}`, wrong: true };
    this.render();
  }

  /** Saves a figure as a file of its own. */
  saveFigure(name: string, svg: string): void {
    const { info } = this.source;
    const caption = `${info.title}, replicate ${this.view.replicate + 1}, generation ${this.view.generation}. Seed ${info.seed}, Rungsight ${info.version}. ${CAUTION}`;
    download(`${fileName(info.title)}-${fileName(name)}.svg`, standalone(svg, this.#dark ? 'dark' : 'light', caption));
  }

  render(): void {
    const { info } = this.source;
    document.title = `${info.title} · Rungsight`;
    const { view, scene } = this;
    const none = new Float64Array(info.generations + 1).fill(NaN);
    const names: [string, string] = [info.arms[view.left].name, info.arms[view.right].name];
    render(
      screenTemplate(
        {
          view,
          title: info.title,
          replicates: info.shown,
          replicateCount: info.replicates,
          report: this.origin.report ?? null,
          armNames: info.arms.map((a) => a.name),
          heads: [scene?.arms[0].name ?? names[0], scene?.arms[1].name ?? names[1]],
          notes: [scene?.arms[0].note ?? '', scene?.arms[1].note ?? ''],
          feet: this.#feet(),
          summary: this.#summary(),
          legend: this.#legend(),
          colourings: this.#colourings(),
          running: this.#running,
          message: this.#message,
          strip: strip(
            {
              shares: [
                this.#frustrated[view.left] ?? none,
                info.arms.length === 1 ? null : (this.#frustrated[view.right] ?? none),
              ],
              names,
              generation: view.generation,
              reached: this.reached,
              every: info.every,
              playing: this.playing,
            },
            { go: (t) => this.goTo(t), play: () => this.play() },
          ),
          drawer: drawer(this),
          overlay: this.#overlay(),
          dark: this.#dark,
        },
        this.#events,
      ),
      this.mount,
    );
    for (const dialog of this.mount.querySelectorAll('dialog')) if (!dialog.open) dialog.showModal();
  }

  readonly #events: ScreenEvents = {
    change: (patch) => void this.change(patch),
    study: () => {
      this.#openSheet();
      this.render();
    },
    run: () => this.run(this.origin.yaml, this.origin.files, this.origin.linked),
    cancel: () => {
      this.#run?.cancel();
      this.#run = null;
      this.#running = null;
      this.#message = { says: 'The run was stopped. What is shown is what it had reached.', wrong: false };
      this.render();
    },
    save: () => {
      this.#saving = { doing: '', trouble: '' };
      this.render();
    },
    find: (said) => this.#find(said),
    theme: () => {
      this.#dark = !this.#dark;
      store('theme', this.#dark ? 'dark' : 'light');
      document.documentElement.dataset.theme = this.#dark ? 'dark' : 'light';
      if (this.stage !== null) this.stage.tokens = this.tokens;
      this.render();
    },
    guide: () => {
      this.#guide = { step: 0, only: false };
      this.render();
      (this.mount.querySelector('.guide') as HTMLElement | null)?.focus();
    },
    dismiss: () => {
      this.#message = null;
      this.render();
    },
    stageKey: (e) => this.#stageKey(e),
  };

  #find(said: string): void {
    const cast = this.scene?.arms[0].cast;
    if (cast === undefined || said.trim() === '') {
      this.select(-1);
      return;
    }
    const named = cast.names?.indexOf(said.trim()) ?? -1;
    const index = named >= 0 ? named : /^\d+$/.test(said.trim()) ? cast.id.indexOf(Number(said)) : -1;
    if (index < 0) {
      this.#message = {
        says: `There is no household ${said.trim()}: numbers run from ${cast.id[0]} to ${cast.id[cast.n - 1]}${
          cast.names === null ? '' : ', and ids are those of the household file'
        }.`,
        wrong: false,
      };
      this.render();
      return;
    }
    this.#message = null;
    this.select(index);
  }

  #overlay(): TemplateResult {
    const close = (what: 'sheet' | 'saving') => (): void => {
      if (what === 'sheet') {
        this.#sheet?.close();
        this.#sheet = null;
      } else this.#saving = null;
      this.render();
    };
    return html`
      ${
        this.#sheet === null
          ? nothing
          : html`<dialog class="sheet" aria-label="Study" @close=${close('sheet')} @cancel=${close('sheet')}>${studySheet(
              this.#sheet,
              {
                close: close('sheet'),
                run: (yaml, files) => {
                  close('sheet')();
                  this.run(yaml, files);
                },
                save: (yaml) =>
                  download(
                    `${fileName(/^study:\s*["']?(.+?)["']?\s*(?:#.*)?$/m.exec(yaml)?.[1] ?? 'study')}.yaml`,
                    yaml,
                  ),
                changed: () => {},
              },
            )}</dialog>`
      }
      ${
        this.#saving === null
          ? nothing
          : html`<dialog class="save" aria-label="Save" @close=${close('saving')} @cancel=${close('saving')}>${saveSheet(
              {
                offers: this.#offers(),
                link: this.origin.linked ? location.href : null,
                note: partialNote(this.source),
                ...this.#saving,
              },
              close('saving'),
              () => void navigator.clipboard?.writeText(location.href),
            )}</dialog>`
      }
      ${
        this.#guide === null
          ? nothing
          : guide(this.#guide.step, this.#guide.only, {
              step: (step) => {
                this.#guide = { step, only: false };
                this.render();
              },
              close: (forGood) => {
                if (forGood) store('guide', 'seen');
                this.#guide = null;
                this.render();
              },
            })
      }
    `;
  }

  /** The walk-through at the first visit; later, the cautions alone, once for each study opened. */
  #caution(): void {
    if (stored('guide') !== 'seen') this.#guide = { step: 0, only: false };
    else if (stored(`caution ${this.source.info.title}`) === null) this.#guide = { step: 0, only: true };
    else return;
    store(`caution ${this.source.info.title}`, 'shown');
    this.render();
  }

  #openSheet(): void {
    this.#sheet ??= openSheet(this.origin.yaml, new Map(this.origin.files));
  }

  #offers(): SaveOffer[] {
    const { source } = this;
    const { info } = source;
    const stem = fileName(info.title);
    const doing = (says: string, act: () => Promise<void>) => async (): Promise<void> => {
      this.#saving = { doing: says, trouble: '' };
      this.render();
      try {
        await act();
        this.#saving = null;
      } catch (error) {
        this.#saving = { doing: '', trouble: error instanceof Error ? error.message : String(error) };
      }
      this.render();
    };
    return [
      {
        name: 'Picture (PNG)',
        says: 'both fields as they stand, with legend and caption',
        act: doing('Drawing the picture …', async () =>
          download(`${stem}-generation-${this.view.generation}.png`, await this.picture()),
        ),
      },
      ...dataOffers(source).map((offer) => ({
        name: offer.name,
        says: offer.says,
        act: doing(offer.doing, async () => {
          const { name, content } = await offer.make();
          download(name, content);
        }),
      })),
    ];
  }

  /** The fields as a picture with legend and caption. */
  async picture(): Promise<Blob> {
    const { stage, scene, view } = this;
    const { info } = this.source;
    if (stage === null || scene === null) throw new Error('There is nothing to draw yet.');
    const scale = Math.max(2, window.devicePixelRatio);
    const texts: PictureTexts = {
      title: `${info.title}, replicate ${view.replicate + 1} of ${info.replicates}`,
      summary: this.#summary(),
      names: [scene.arms[0].name, scene.arms[1].name],
      notes: [scene.arms[0].note, scene.arms[1].note],
      feet: this.#feet(),
      legend: this.#legend(),
      caption: `Study “${info.title}”; arms ${scene.arms[0].name} and ${scene.arms[1].name}; generation ${view.generation} of ${info.generations}; ${plural(scene.arms[0].cast.n, 'household')}; seed ${info.seed}; Rungsight ${info.version}.`,
    };
    return stage.still(scale, () => picture(stage.root, texts, this.tokens, scale));
  }

  #legend(): readonly LegendItem[] {
    const { info } = this.source;
    const { view, scene } = this;
    return legend(
      view.colouring,
      this.tokens,
      info.groupNames,
      info.arms[view.left].model.milestones.length,
      scene?.arms[0].now.decided ?? true,
      scene?.arms.some((a) => a.pockets.length > 0) ?? false,
    );
  }

  #measurePanel(): void {
    const panel = this.mount.querySelector('.panel');
    if (panel === null) return;
    const rem = Number.parseFloat(getComputedStyle(document.documentElement).fontSize);
    const width = ((panel.clientWidth - 2.4 * rem) / rem) * 13;
    const height = ((panel.clientHeight - 1.4 * rem) / rem) * 13;
    if (Math.abs(width - this.panelSize.width) < 1 && Math.abs(height - this.panelSize.height) < 1) return;
    this.panelSize = { width, height };
    this.render();
  }

  #stageKey(e: KeyboardEvent): void {
    if ((e.target as Element).closest('select, input, button') !== null || e.ctrlKey || e.metaKey || e.altKey) return;
    const stage = this.stage;
    if (stage === null) return;
    const acts: Record<string, () => void> = {
      '+': () => stage.zoom(1.5),
      '=': () => stage.zoom(1.5),
      '-': () => stage.zoom(1 / 1.5),
      '0': () => stage.wholeField(),
      ArrowLeft: () => stage.shift(0.15, 0),
      ArrowRight: () => stage.shift(-0.15, 0),
      ArrowUp: () => stage.shift(0, 0.15),
      ArrowDown: () => stage.shift(0, -0.15),
      '.': () => this.#stepHousehold(1),
      ',': () => this.#stepHousehold(-1),
      Escape: () => this.select(-1),
    };
    if (!(e.key in acts)) return;
    e.preventDefault();
    acts[e.key]();
  }

  #stepHousehold(by: number): void {
    const scene = this.scene;
    if (scene === null) return;
    const n = scene.arms[0].cast.n;
    this.select(scene.selected < 0 ? 0 : (scene.selected + by + n) % n);
  }

  #key(e: KeyboardEvent): void {
    const at = e.target as Element;
    if (e.key === 'Escape' && this.#guide !== null) {
      this.#guide = null;
      this.render();
      return;
    }
    if (e.key === ' ' && at.closest('button, select, input, textarea, a, dialog, [contenteditable]') === null) {
      e.preventDefault();
      this.play();
    }
  }

  #allowed(view: View): View {
    const { info } = this.source;
    const within = (v: number, most: number): number => Math.max(0, Math.min(most, v));
    const arms = info.arms.length - 1;
    const reached = this.reached;
    const wanted = within(view.generation, reached);
    return {
      ...view,
      replicate: info.shown.includes(view.replicate) ? view.replicate : (info.shown[0] ?? 0),
      generation: wanted === reached ? reached : Math.round(wanted / info.every) * info.every,
      left: within(view.left, arms),
      right: within(view.right, arms),
      colouring: this.#colourings().includes(view.colouring) ? view.colouring : 'status',
    };
  }

  #colourings(): Colouring[] {
    const { info } = this.source;
    const treated = this.scene?.arms.some((a) => a.cast.treated !== null) ?? true;
    return COLOURINGS.filter((c) => (c !== 'group' || info.groupNames.length > 1) && (c !== 'treated' || treated));
  }

  #feet(): [string, string] {
    const { scene } = this;
    if (scene === null) return ['', ''];
    if (scene.arrangement === 'ladder') return [scene.sidewaysSays, scene.sidewaysSays];
    return scene.arms.map((a) => (a.map === null ? 'laying out the map …' : (a.print ?? ''))) as [string, string];
  }

  /** The generation shown in a sentence. */
  #summary(): string {
    const { scene, view } = this;
    if (scene === null) return this.#running === null ? 'Reading the study …' : 'Running the study …';
    const [a, b] = scene.arms;
    if (!a.now.decided) return `Generation ${scene.generation}: the last children, before they decide.`;
    const shareA = this.#frustrated[view.left]?.[scene.generation];
    const shareB = this.#frustrated[view.right]?.[b.now.generation];
    const pockets = a.pockets.length + b.pockets.length;
    const where =
      this.#pockets === null
        ? ''
        : pockets === 0
          ? '; no pocket'
          : `; ${plural(pockets, 'pocket')}${
              a.pockets.length === 0
                ? `, ${pockets === 1 ? '' : 'all '}in ${b.name}`
                : b.pockets.length === 0
                  ? `, ${pockets === 1 ? '' : 'all '}in ${a.name}`
                  : `, ${a.pockets.length} in ${a.name}`
            }`;
    const beside = this.source.info.arms.length === 1 ? 'at the start' : `in ${b.name}`;
    return `Generation ${scene.generation}: ${percent(shareA ?? NaN)} frustrated in ${a.name}, ${percent(shareB ?? NaN)} ${beside}${where}.`;
  }
}

/** Frustrated share by arm and generation of a replicate. */
function sharesOf(
  table: Table | null,
  arms: readonly string[],
  generations: number,
  replicate: number,
): Float64Array[] {
  const out = arms.map(() => new Float64Array(generations + 1).fill(NaN));
  if (table === null) return out;
  const arm = text(table, 'arm');
  const rep = numbers(table, 'replicate');
  const generation = numbers(table, 'generation');
  const share = numbers(table, 'share_frustrated');
  for (let r = 0; r < table.rows; r++) {
    const k = rep[r] === replicate ? arms.indexOf(arm[r]) : -1;
    if (k >= 0 && generation[r] <= generations) out[k][generation[r]] = share[r];
  }
  return out;
}

/** Pockets of a generation that are more than chance, with their core members. */
function pocketsOf(snapshot: Snapshot, table: Table | null, arm: string, replicate: number): ShownPocket[] {
  if (table === null || !snapshot.decided) return [];
  const arms = text(table, 'arm');
  const [rep, generation, id, p] = ['replicate', 'generation', 'pocket', 'p_value'].map((name) => numbers(table, name));
  const found = new Map<number, { members: number[]; pValue: number }>();
  for (let k = 0; k < table.rows; k++) {
    if (arms[k] === arm && rep[k] === replicate && generation[k] === snapshot.generation && p[k] < LEVEL)
      found.set(id[k], { members: [], pValue: p[k] });
  }
  for (let i = 0; i < snapshot.pocket.length; i++)
    if (snapshot.role[i] === ROLE.core) found.get(snapshot.pocket[i])?.members.push(i);
  return [...found].filter(([, { members }]) => members.length > 0).map(([pocket, rest]) => ({ id: pocket, ...rest }));
}

/** What an arm's network reached, in a few words. */
function noteOf(
  reached: Readonly<Record<string, number>>,
  cast: Cast,
  ties: { start: Uint32Array; target: Uint32Array },
): string {
  const said: string[] = [];
  const within = (labels: Uint32Array): number => {
    let same = 0;
    for (let i = 0; i < cast.n; i++)
      for (let e = ties.start[i]; e < ties.start[i + 1]; e++) if (labels[ties.target[e]] === labels[i]) same++;
    return ties.target.length > 0 ? same / ties.target.length : NaN;
  };
  if (cast.places > 1) said.push(`ties within place ${percent(within(cast.place))}`);
  else if (cast.groups > 1) said.push(`ties within group ${percent(within(cast.group))}`);
  const connected = reached.economic_connectedness;
  if (connected !== undefined) said.push(`connectedness ${connected.toFixed(2)}`);
  return said.join(', ');
}

/** Kept on this machine only, and only what the reader chose; a browser that keeps nothing is fine. */
function stored(key: string): string | null {
  try {
    return localStorage.getItem(`rungsight ${key}`);
  } catch {
    return null;
  }
}

function store(key: string, value: string): void {
  try {
    localStorage.setItem(`rungsight ${key}`, value);
  } catch {
    // a browser that keeps nothing shows the walk-through again
  }
}
