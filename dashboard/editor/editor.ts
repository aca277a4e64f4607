/** The rules editor: CodeMirror in a shadow root. */
import {
  autocompletion,
  closeBrackets,
  closeBracketsKeymap,
  completionKeymap,
} from '@codemirror/autocomplete';
import { defaultKeymap, history, historyKeymap } from '@codemirror/commands';
import { indentUnit } from '@codemirror/language';
import { type Diagnostic, lintGutter, lintKeymap, setDiagnostics } from '@codemirror/lint';
import { EditorState } from '@codemirror/state';
import {
  drawSelection,
  EditorView,
  highlightActiveLine,
  highlightActiveLineGutter,
  keymap,
  lineNumbers,
} from '@codemirror/view';
import type { RigNames, RulesProblem } from '../../server/web/rules/rulesMessages.js';
import { complete } from './completion.js';
import { rules } from './language.js';
import { look } from './look.js';

export interface EditorEvents {
  changed(text: string): void;
  cursor(offset: number): void;
  save(): void;
  rehearse(): void;
  readonly rig: () => RigNames | undefined;
}

/**
 * One editor in a box of the page.
 *
 * It lives in a shadow root because there, and only there, CodeMirror's styles go into a constructed
 * style sheet (`adoptedStyleSheets`): in the document they would be a `style` element, which the
 * page's content security policy refuses.
 */
export class RulesEditor {
  private readonly view: EditorView;
  /** Set while the page itself changes the text or the cursor. */
  private quiet = false;

  constructor(box: HTMLElement, text: string, cursor: number, events: EditorEvents) {
    const root = box.shadowRoot ?? box.attachShadow({ mode: 'open', delegatesFocus: true });
    root.replaceChildren();
    this.view = new EditorView({
      parent: root,
      root,
      doc: text,
      selection: { anchor: Math.min(cursor, text.length) },
      extensions: [
        lineNumbers(),
        lintGutter(),
        highlightActiveLine(),
        highlightActiveLineGutter(),
        history(),
        drawSelection(),
        closeBrackets(),
        indentUnit.of('  '),
        EditorState.tabSize.of(2),
        autocompletion({
          override: [(context) => complete(context, events.rig())],
          icons: false,
        }),
        rules,
        look,
        EditorView.lineWrapping,
        EditorView.contentAttributes.of({ 'aria-label': 'Rules file', tabindex: '0' }),
        keymap.of([
          { key: 'Mod-s', preventDefault: true, run: done(events.save) },
          { key: 'Mod-Enter', preventDefault: true, run: done(events.rehearse) },
          ...closeBracketsKeymap,
          ...completionKeymap,
          ...lintKeymap.filter(({ key }) => key === 'F8'),
          ...historyKeymap,
          // Tab goes on to the next control, as everywhere on the page (WCAG 2.2, 2.1.2).
          ...defaultKeymap.filter(({ key }) => key !== 'Escape'),
        ]),
        EditorView.updateListener.of((update) => {
          if (this.quiet) return;
          if (update.docChanged) events.changed(update.state.doc.toString());
          if (update.selectionSet || update.docChanged) {
            events.cursor(update.state.selection.main.head);
          }
        }),
      ],
    });
  }

  /** Marks problems where they stand. */
  show(problems: readonly RulesProblem[]): void {
    const end = this.view.state.doc.length;
    const found = problems.filter(({ here }) => here).map((problem) => diagnosticOf(problem, end));
    this.quiet = true;
    this.view.dispatch(setDiagnostics(this.view.state, found));
    this.quiet = false;
  }

  /** Puts the cursor somewhere and shows it, without taking the focus. */
  goTo(offset: number): void {
    const anchor = Math.min(offset, this.view.state.doc.length);
    this.view.dispatch({
      selection: { anchor },
      effects: EditorView.scrollIntoView(anchor, { y: 'nearest', yMargin: 40 }),
    });
  }

  focus(): void {
    this.view.focus();
  }

  release(): void {
    this.view.destroy();
  }
}

/** A key's command that has always been dealt with. */
function done(act: () => void): () => boolean {
  return () => {
    act();
    return true;
  };
}

/** A problem as the editor shows it where it stands, with the nearest name to put in its place. */
function diagnosticOf(problem: RulesProblem, end: number): Diagnostic {
  const from = Math.min(problem.from, end);
  const to = Math.min(Math.max(problem.to, from), end);
  const { nearest } = problem;
  return {
    from,
    to,
    severity: problem.severity,
    message: problem.message,
    renderMessage: () => messageOf(problem),
    ...(nearest === undefined
      ? {}
      : {
          actions: [
            {
              name: `Write ${nearest}`,
              apply: (view: EditorView, start: number, stop: number) =>
                view.dispatch({ changes: { from: start, to: stop, insert: nearest } }),
            },
          ],
        }),
  };
}

function messageOf(problem: RulesProblem): Node {
  const box = document.createElement('div');
  const line = (text: string, name: string) => {
    const part = document.createElement('div');
    part.className = name;
    part.textContent = text;
    box.append(part);
  };
  line(problem.message, 'message');
  if (problem.expected !== undefined) line(`expected: ${problem.expected}`, 'more');
  for (const { line: at, note } of problem.also) line(`line ${at}: ${note}`, 'more');
  return box;
}
