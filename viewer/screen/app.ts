/**
 * The app: holds the view and the source, loads what the view needs, hands a scene to the stage and texts to the
 * screen. Everything the reader does comes through here.
 */
import { html, render } from 'lit-html';
import { Loader } from '../data/loader.js';
import { numbers, ROLE, type Snapshot, type Source, text } from '../data/source.js';
import { drawer } from '../drawer/drawer.js';
import { type Axis, axes } from '../field/arrangement.js';
import { FieldCanvas } from '../field/canvas.js';
import { COLOURINGS, type Colouring, legend } from '../field/colouring.js';
import type { ArmScene, Scene, ShownPocket } from '../field/scene.js';
import { sidewaysOf } from '../field/sideways.js';
import { reducedMotion, Stage } from '../field/stage.js';
import { strip } from '../strip/strip.js';
import { type ScreenEvents, screenTemplate } from './screen.js';
import { DARK, LIGHT, type Tokens } from './tokens.js';
import { fromLink, START, toLink, type View } from './view.js';
import { percent, plural } from './words.js';

const DWELL = 1050;

export class App {
  readonly mount: HTMLElement;
  view: View = START;
  loader: Loader;
  stage: Stage | null = null;
  scene: Scene | null = null;
  playing = false;
  /** Frustrated shares by arm, of the replicate shown. */
  #shares: Float64Array[] = [];
  #axes: Axis[] = [];
  #sideways = new Map<string, Float32Array>();
  #turn = 0;
  #timer = 0;
  #dark: boolean;

  constructor(mount: HTMLElement, source: Source) {
    this.mount = mount;
    this.loader = new Loader(source);
    const kept = localStorage.getItem('rungsight-theme');
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
    return this.source.info.generations;
  }

  async start(): Promise<void> {
    this.render();
    const root = this.mount.querySelector('.stage') as HTMLElement;
    const canvas = await FieldCanvas.open(root.querySelector('canvas') as HTMLCanvasElement);
    this.stage = new Stage(root, canvas, { select: (i) => this.select(i) }, this.tokens);
    await this.load();
  }

  /** Changes the view and shows it. */
  async change(patch: Partial<View>, still = false): Promise<void> {
    const last = this.view;
    this.view = this.#allowed({ ...last, ...patch });
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

  /** Loads what the view needs and shows it; a later call overtakes an earlier one. */
  async load(still = false): Promise<void> {
    const turn = ++this.#turn;
    const { view, loader } = this;
    const { replicate, generation } = view;
    const arms = [view.left, view.right];
    const [casts, ties, now, earlier, extents] = await Promise.all([
      Promise.all(arms.map((a) => loader.cast(a, replicate))),
      Promise.all(arms.map((a) => loader.ties(a, replicate, Math.min(generation, this.source.info.generations - 1)))),
      Promise.all(arms.map((a) => loader.snapshot(a, replicate, generation))),
      Promise.all(arms.map((a) => (generation > 0 ? loader.snapshot(a, replicate, generation - 1) : null))),
      Promise.all(arms.map((a) => loader.extents(a, replicate))),
    ]);
    await this.#loadShares();
    if (turn !== this.#turn) return;
    this.#axes = axes(extents);
    const selected = view.household === null ? -1 : casts[0].id.indexOf(view.household);
    const scene: Scene = {
      generation,
      arms: [0, 1].map((k): ArmScene => {
        const key = `${arms[k]}/${replicate}`;
        let sideways = this.#sideways.get(key);
        if (sideways === undefined) {
          sideways = sidewaysOf(casts[k], earlier[k] ?? now[k]);
          this.#sideways.set(key, sideways);
        }
        return {
          name: this.source.info.arms[arms[k]].name,
          note: this.#note(arms[k]),
          cast: casts[k],
          now: now[k],
          earlier: earlier[k],
          ties: ties[k],
          sideways,
          map: null,
          print: null,
          pockets: pocketsOf(now[k]),
        };
      }) as [ArmScene, ArmScene],
      arrangement: view.arrangement,
      colouring: view.colouring,
      tiesShown: view.ties,
      axis: this.#axes[generation] ?? { low: 0, high: 1 },
      selected,
      pocket: [0, 1].map((k) => (view.pocket?.field === k ? view.pocket.id : -1)) as [number, number],
      sidewaysSays: casts[0].places > 1 ? 'places, poorer to richer →' : '',
      groupNames: this.source.info.groupNames,
    };
    this.scene = scene;
    this.render();
    this.stage?.show(scene, still);
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
        await this.change({ generation: this.view.generation + 1 });
        this.#timer = window.setTimeout(step, reducedMotion() ? 1600 : DWELL);
      };
      if (this.view.generation >= this.reached)
        void this.change({ generation: 0 }, true).then(() => {
          this.#timer = window.setTimeout(step, 400);
        });
      else void step();
    }
    this.render();
  }

  render(): void {
    const { info } = this.source;
    const { view, scene } = this;
    const decided = scene?.arms[0].now.decided ?? true;
    const shares: [Float64Array, Float64Array] = [
      this.#shares[view.left] ?? new Float64Array(info.generations + 1).fill(NaN),
      this.#shares[view.right] ?? new Float64Array(info.generations + 1).fill(NaN),
    ];
    const names: [string, string] = [info.arms[view.left].name, info.arms[view.right].name];
    render(
      screenTemplate(
        {
          view,
          title: info.title,
          replicates: info.shown,
          replicateCount: info.replicates,
          armNames: info.arms.map((a) => a.name),
          notes: [scene?.arms[0].note ?? '', scene?.arms[1].note ?? ''],
          feet: this.#feet(),
          summary: this.#summary(),
          legend: legend(
            view.colouring,
            this.tokens,
            info.groupNames,
            info.arms[view.left].model.milestones.length,
            decided,
            scene?.arms.some((a) => a.pockets.length > 0) ?? false,
          ),
          colourings: this.#colourings(),
          running: null,
          strip: strip(
            { shares, names, generation: view.generation, reached: this.reached, playing: this.playing },
            { go: (t) => this.goTo(t), play: () => this.play() },
          ),
          drawer: drawer(this),
          overlay: html``,
          dark: this.#dark,
        },
        this.#events,
      ),
      this.mount,
    );
  }

  goTo(generation: number): void {
    this.play(false);
    if (generation !== this.view.generation) void this.change({ generation });
  }

  readonly #events: ScreenEvents = {
    change: (patch) => void this.change(patch),
    study: () => {},
    run: () => {},
    cancel: () => {},
    save: () => {},
    find: (said) => {
      const id = Number.parseInt(said, 10);
      const cast = this.scene?.arms[0].cast;
      if (cast === undefined) return;
      const index = Number.isNaN(id) ? -1 : cast.id.indexOf(id);
      this.select(index);
    },
    theme: () => {
      this.#dark = !this.#dark;
      localStorage.setItem('rungsight-theme', this.#dark ? 'dark' : 'light');
      document.documentElement.dataset.theme = this.#dark ? 'dark' : 'light';
      if (this.stage !== null) this.stage.tokens = this.tokens;
      this.render();
    },
    guide: () => {},
    stageKey: (e) => this.#stageKey(e),
  };

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
    if (e.key === ' ' && at.closest('button, select, input, textarea, a, [role=dialog]') === null) {
      e.preventDefault();
      this.play();
    }
  }

  #allowed(view: View): View {
    const { info } = this.source;
    const within = (v: number, most: number): number => Math.max(0, Math.min(most, v));
    const arms = info.arms.length - 1;
    return {
      ...view,
      replicate: info.shown.includes(view.replicate) ? view.replicate : (info.shown[0] ?? 0),
      generation: within(view.generation, this.reached),
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

  async #loadShares(): Promise<void> {
    const table = await this.source.table('indicators');
    const { info } = this.source;
    this.#shares = info.arms.map(() => new Float64Array(info.generations + 1).fill(NaN));
    if (table === null) return;
    const arm = text(table, 'arm');
    const replicate = numbers(table, 'replicate');
    const generation = numbers(table, 'generation');
    const share = numbers(table, 'share_frustrated');
    for (let r = 0; r < table.rows; r++) {
      if (replicate[r] !== this.view.replicate) continue;
      const k = info.arms.findIndex((a) => a.name === arm[r]);
      if (k >= 0) this.#shares[k][generation[r]] = share[r];
    }
  }

  #note(arm: number): string {
    const { reached } = this.source.info.arms[arm];
    const said: string[] = [];
    if (reached.economic_connectedness !== undefined)
      said.push(`economic connectedness ${reached.economic_connectedness.toFixed(2)}`);
    return said.join(', ');
  }

  #feet(): [string, string] {
    const says = this.view.arrangement === 'ladder' ? (this.scene?.sidewaysSays ?? '') : '';
    return [says, says];
  }

  /** The generation shown in a sentence. */
  #summary(): string {
    const { scene, view } = this;
    if (scene === null) return 'Reading the study …';
    const { info } = this.source;
    const [a, b] = scene.arms;
    if (!a.now.decided) return `Generation ${view.generation}: the last children, before they decide.`;
    const shareA = this.#shares[view.left]?.[view.generation];
    const shareB = this.#shares[view.right]?.[view.generation];
    const pockets = a.pockets.length + b.pockets.length;
    const where =
      pockets === 0
        ? 'no pocket is more than chance'
        : `${plural(pockets, 'pocket')}${a.pockets.length === 0 ? `, all in ${b.name}` : b.pockets.length === 0 ? `, all in ${a.name}` : `, ${a.pockets.length} in ${a.name}`}`;
    const years = info.yearsPerGeneration > 0 && view.generation > 0 ? '' : '';
    return `Generation ${view.generation}${years}: ${percent(shareA)} frustrated in ${a.name}, ${percent(shareB)} in ${b.name}; ${where}.`;
  }
}

function pocketsOf(snapshot: Snapshot): ShownPocket[] {
  const by = new Map<number, number[]>();
  for (let i = 0; i < snapshot.pocket.length; i++) {
    if (snapshot.role[i] !== ROLE.core || snapshot.pocket[i] < 0) continue;
    const list = by.get(snapshot.pocket[i]);
    if (list === undefined) by.set(snapshot.pocket[i], [i]);
    else list.push(i);
  }
  return [...by].map(([id, members]) => ({ id, members, pValue: NaN }));
}
