/**
 * The editor of the study's YAML: line numbers, marks at every problem, undo that the form shares.
 *
 * It stands in a shadow root, where the editing library puts its rules into constructed style sheets; in the page
 * itself it would write a style element, which the content security policy refuses.
 */
import { defaultKeymap, history, historyKeymap, redo, redoDepth, undo, undoDepth } from '@codemirror/commands';
import { yaml } from '@codemirror/lang-yaml';
import { HighlightStyle, indentUnit, syntaxHighlighting } from '@codemirror/language';
import { type Diagnostic, lintGutter, lintKeymap, setDiagnostics } from '@codemirror/lint';
import { EditorState, StateEffect, StateField } from '@codemirror/state';
import {
  Decoration,
  type DecorationSet,
  EditorView,
  highlightActiveLine,
  hoverTooltip,
  keymap,
  lineNumbers,
} from '@codemirror/view';
import { tags } from '@lezer/highlight';
import type { Fault } from './draft.js';
import { difference } from './edit.js';

export interface EditorEvents {
  /** The text has changed, by typing, by undo, or by `replace`. */
  changed(text: string): void;
  /** The cursor has been put somewhere by hand. */
  moved(offset: number): void;
  /** The sentence on what stands at a place, or null. */
  explain(offset: number): { readonly title: string; readonly sentence: string; readonly usual: string | null } | null;
}

/** The line of the setting the form is at. */
const setMarked = StateEffect.define<{ from: number; to: number } | null>();
const marked = StateField.define<DecorationSet>({
  create: () => Decoration.none,
  update(marks, transaction) {
    let now = marks.map(transaction.changes);
    for (const effect of transaction.effects) {
      if (!effect.is(setMarked)) continue;
      if (effect.value === null) now = Decoration.none;
      else {
        const { doc } = transaction.state;
        const first = doc.lineAt(Math.min(effect.value.from, doc.length)).number;
        const last = doc.lineAt(Math.min(effect.value.to, doc.length)).number;
        const lines = [];
        for (let line = first; line <= last; line++) {
          lines.push(Decoration.line({ class: 'marked' }).range(doc.line(line).from));
        }
        now = Decoration.set(lines);
      }
    }
    return now;
  },
  provide: (field) => EditorView.decorations.from(field),
});

const look = EditorView.theme({
  '&': { height: '100%', color: 'var(--ink)', backgroundColor: 'var(--panel)', fontSize: '1rem' },
  '&.cm-focused': { outline: 'none' },
  '.cm-scroller': {
    fontFamily: 'ui-monospace, "Liberation Mono", "DejaVu Sans Mono", Menlo, Consolas, monospace',
    fontSize: '0.95em',
    lineHeight: '1.55',
    overflow: 'auto',
  },
  '.cm-content': { padding: '0.7rem 0', caretColor: 'var(--ink)' },
  '.cm-line': { padding: '0 1rem 0 0.4rem' },
  '.cm-cursor': { borderLeftColor: 'var(--ink)' },
  '.cm-gutters': { backgroundColor: 'var(--panel)', color: 'var(--soft)', border: 'none' },
  '.cm-lineNumbers .cm-gutterElement': { padding: '0 0.3rem 0 0.8rem', minWidth: '2.4rem' },
  '.cm-gutter-lint': { width: '1.1rem' },
  '.cm-gutter-lint .cm-gutterElement': { padding: '0.3rem 0.15rem' },
  '.cm-lint-marker': { width: '0.75rem', height: '0.75rem', content: 'none' },
  '.cm-lint-marker-error': {
    content: 'none',
    borderRadius: '50%',
    border: '0.17rem solid var(--frustrated)',
    backgroundColor: 'transparent',
  },
  '.cm-lintRange-error': {
    backgroundImage: 'none',
    textDecoration: 'underline wavy var(--frustrated) 1px',
    textUnderlineOffset: '0.2em',
  },
  '.cm-activeLine': { backgroundColor: 'transparent' },
  '&.cm-focused .cm-activeLine': { backgroundColor: 'var(--faint)' },
  '.cm-line.marked': { backgroundColor: 'var(--faint)' },
  '&.cm-focused .cm-selectionBackground, .cm-selectionBackground, .cm-content ::selection': {
    backgroundColor: 'var(--line)',
  },
  '.cm-tooltip': {
    backgroundColor: 'var(--panel)',
    color: 'var(--ink)',
    border: '1px solid var(--line)',
    borderRadius: '0.5rem',
    fontFamily: '"Atkinson Hyperlegible Next", sans-serif',
    maxWidth: '30rem',
    padding: '0.5rem 0.8rem',
    boxShadow: '0 0.3rem 1.2rem rgb(0 0 0 / 0.14)',
  },
  '.cm-tooltip .cm-diagnostic': { borderLeft: 'none', padding: '0', whiteSpace: 'normal' },
  '.usual': { color: 'var(--soft)' },
});

// words carry the meaning; two weights and one soft tone are enough to read structure by
const highlight = HighlightStyle.define([
  { tag: [tags.definition(tags.propertyName), tags.propertyName], color: 'var(--ink)', fontWeight: '600' },
  { tag: tags.comment, color: 'var(--soft)', fontStyle: 'italic' },
  { tag: [tags.separator, tags.punctuation, tags.squareBracket, tags.brace], color: 'var(--soft)' },
  { tag: [tags.string, tags.content, tags.number, tags.bool], color: 'var(--ink)' },
]);

export class YamlEditor {
  /** To be put into the page. */
  readonly element: HTMLElement;
  readonly #view: EditorView;
  readonly #events: EditorEvents;
  #silent = false;

  constructor(text: string, events: EditorEvents) {
    this.#events = events;
    this.element = document.createElement('div');
    this.element.className = 'yaml-editor';
    const root = this.element.attachShadow({ mode: 'open' });
    const host = document.createElement('div');
    host.className = 'host';
    const sheet = new CSSStyleSheet();
    sheet.replaceSync('.host { height: 100%; } * { box-sizing: border-box; }');
    root.adoptedStyleSheets = [sheet];
    root.append(host);
    this.#view = new EditorView({
      root,
      parent: host,
      state: EditorState.create({
        doc: text,
        extensions: [
          lineNumbers(),
          history(),
          yaml(),
          indentUnit.of('  '),
          EditorState.tabSize.of(2),
          syntaxHighlighting(highlight),
          highlightActiveLine(),
          EditorView.lineWrapping,
          lintGutter(),
          marked,
          // Tab is left to the keyboard's way through the page
          keymap.of([...defaultKeymap, ...historyKeymap, ...lintKeymap]),
          EditorView.contentAttributes.of({ 'aria-label': 'The study as YAML', spellcheck: 'false', tabindex: '0' }),
          look,
          hoverTooltip((_, position) => this.#tooltip(position)),
          EditorView.updateListener.of((update) => {
            if (update.docChanged) this.#events.changed(update.state.doc.toString());
            const byHand = update.transactions.some(
              (one) => one.isUserEvent('select') || one.isUserEvent('input.type'),
            );
            if (update.selectionSet && byHand && !this.#silent) this.#events.moved(update.state.selection.main.head);
          }),
        ],
      }),
    });
  }

  get text(): string {
    return this.#view.state.doc.toString();
  }

  /** Replaces the text by what differs, as one step of the history. */
  replace(text: string): void {
    const change = difference(this.text, text);
    if (change === null) return;
    this.#silent = true;
    this.#view.dispatch({ changes: change, userEvent: 'input.type.form' });
    this.#silent = false;
  }

  undo(): void {
    undo(this.#view);
  }

  redo(): void {
    redo(this.#view);
  }

  get canUndo(): boolean {
    return undoDepth(this.#view.state) > 0;
  }

  get canRedo(): boolean {
    return redoDepth(this.#view.state) > 0;
  }

  /** Shows problems at their lines. */
  show(faults: readonly Fault[]): void {
    const { length } = this.#view.state.doc;
    const diagnostics = faults
      .filter((fault) => fault.elsewhere === null)
      .map(
        (fault): Diagnostic => ({
          from: Math.min(fault.from, length),
          to: Math.min(Math.max(fault.to, fault.from), length),
          severity: 'error',
          message: `${fault.problem}; ${fault.remedy}`,
        }),
      );
    this.#view.dispatch(setDiagnostics(this.#view.state, diagnostics));
  }

  /** Marks the lines of a setting and brings them into sight; null marks nothing. */
  mark(stretch: { readonly from: number; readonly to: number } | null): void {
    const effects: StateEffect<unknown>[] = [setMarked.of(stretch)];
    if (stretch !== null) {
      const at = Math.min(stretch.from, this.#view.state.doc.length);
      effects.push(EditorView.scrollIntoView(at, { y: 'nearest', yMargin: 60 }));
    }
    this.#view.dispatch({ effects });
  }

  /** Puts the cursor at a place and the keyboard into the editor. */
  go(offset: number): void {
    const at = Math.min(offset, this.#view.state.doc.length);
    this.#view.dispatch({ selection: { anchor: at }, effects: EditorView.scrollIntoView(at, { y: 'center' }) });
    this.#view.focus();
  }

  close(): void {
    this.#view.destroy();
  }

  #tooltip(position: number): { pos: number; above: boolean; create(): { dom: HTMLElement } } | null {
    const said = this.#events.explain(position);
    if (said === null || said.sentence === '') return null;
    return {
      pos: position,
      above: true,
      create: () => {
        const dom = document.createElement('div');
        const title = document.createElement('strong');
        title.textContent = said.title;
        dom.append(title, ` ${said.sentence}`);
        if (said.usual !== null) {
          const usual = document.createElement('div');
          usual.className = 'usual';
          usual.textContent = `usual: ${said.usual}`;
          dom.append(usual);
        }
        return { dom };
      },
    };
  }
}
