import type { ComponentChildren } from 'preact';

/** A table that is longer than its place. */
export function ScrollBox({ label, children }: { label: string; children: ComponentChildren }) {
  return (
    // biome-ignore lint/a11y/noNoninteractiveTabindex: a box that scrolls must be reachable by key
    <section class="rows-box" aria-label={label} tabIndex={0}>
      {children}
    </section>
  );
}
