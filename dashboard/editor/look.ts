import { EditorView } from '@codemirror/view';

const MONO = 'ui-monospace, "Cascadia Mono", "DejaVu Sans Mono", "Liberation Mono", monospace';

/** The editor in the page's own colours: custom properties reach into the shadow root. */
export const look = EditorView.theme({
  '&': {
    height: '100%',
    color: 'var(--ink)',
    backgroundColor: 'var(--panel)',
    fontSize: '14px',
  },
  // The box around it shows the focus.
  '&.cm-focused': { outline: 'none' },
  '.cm-scroller': { fontFamily: MONO, lineHeight: '1.55' },
  '.cm-content': { caretColor: 'var(--ink)', paddingBlock: '10px' },
  '.cm-cursor': { borderLeft: '2px solid var(--ink)' },
  '.cm-gutters': {
    backgroundColor: 'var(--panel)',
    color: 'var(--soft)',
    border: '0',
    borderRight: '1px solid var(--line)',
  },
  '.cm-activeLine': { backgroundColor: 'color-mix(in srgb, var(--accent) 12%, transparent)' },
  '.cm-activeLineGutter': { backgroundColor: 'var(--raised)', color: 'var(--ink)' },
  '& .cm-selectionLayer .cm-selectionBackground, &.cm-focused .cm-selectionLayer .cm-selectionBackground':
    { background: 'color-mix(in srgb, var(--accent) 32%, transparent)' },
  '.cm-lintRange': { backgroundImage: 'none', paddingBottom: '1px' },
  '.cm-lintRange-error': {
    textDecoration: 'underline wavy 1.5px var(--bad)',
    textUnderlineOffset: '4px',
  },
  '.cm-lintRange-warning': {
    textDecoration: 'underline dotted 2px var(--warn)',
    textUnderlineOffset: '4px',
  },
  '.cm-lint-marker': { content: '""', width: '9px', height: '9px', margin: '6px 2px 0' },
  '.cm-lint-marker-error': { content: '""', background: 'var(--bad)', borderRadius: '50%' },
  '.cm-lint-marker-warning': {
    content: '""',
    background: 'var(--warn)',
    transform: 'rotate(45deg)',
  },
  '.cm-tooltip': {
    color: 'var(--ink)',
    backgroundColor: 'var(--raised)',
    border: '1px solid var(--edge)',
    borderRadius: 'var(--radius)',
    maxWidth: 'min(520px, 90vw)',
  },
  '.cm-tooltip.cm-tooltip-autocomplete > ul': { fontFamily: MONO, maxHeight: '16em' },
  '.cm-tooltip.cm-tooltip-autocomplete > ul > li': { padding: '3px 8px' },
  '.cm-tooltip.cm-tooltip-autocomplete > ul > li[aria-selected]': {
    background: 'var(--accent)',
    color: 'var(--ground)',
  },
  '.cm-completionDetail': { color: 'inherit', fontStyle: 'normal', opacity: '0.8' },
  '.cm-completionMatchedText': { textDecoration: 'none', fontWeight: '700' },
  '.cm-tooltip.cm-completionInfo': { padding: '4px 10px', fontFamily: 'var(--font)' },
  '.cm-diagnostic': {
    fontFamily: 'var(--font)',
    padding: '6px 10px',
    borderLeft: '4px solid var(--bad)',
  },
  '.cm-diagnostic-warning': { borderLeftColor: 'var(--warn)' },
  '.cm-diagnostic .more': { color: 'var(--soft)', fontSize: '13px' },
  '.cm-diagnosticAction': {
    color: 'var(--ink)',
    background: 'var(--panel)',
    border: '1px solid var(--edge)',
    borderRadius: '4px',
    padding: '3px 8px',
    margin: '6px 0 0',
  },
});
