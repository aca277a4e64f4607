/** The theme's colours, read from the style sheet so that they are written down once. */
export interface Palette {
  readonly ground: string;
  readonly raised: string;
  readonly line: string;
  readonly ink: string;
  readonly soft: string;
  readonly accent: string;
  readonly lick: string;
  readonly water: string;
  readonly stim: string;
  readonly warn: string;
  readonly bad: string;
  readonly font: string;
}

export function readPalette(): Palette {
  const style = getComputedStyle(document.documentElement);
  const value = (name: string) => style.getPropertyValue(`--${name}`).trim();
  return {
    ground: value('ground'),
    raised: value('raised'),
    line: value('line'),
    ink: value('ink'),
    soft: value('soft'),
    accent: value('accent'),
    lick: value('lick'),
    water: value('water'),
    stim: value('stim'),
    warn: value('warn'),
    bad: value('bad'),
    font: value('font') || 'sans-serif',
  };
}
