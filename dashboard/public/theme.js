// Runs before the first paint, so that a page in the dark never flashes white.
(() => {
  let theme = 'dark';
  try {
    theme = localStorage.getItem('lapwing.theme') ?? 'dark';
  } catch {
    // Storage may be switched off; the dark theme is the safe one.
  }
  if (!['dark', 'red', 'light'].includes(theme)) theme = 'dark';
  document.documentElement.dataset.theme = theme;
  let lamp = 1;
  try {
    lamp = Number(localStorage.getItem('lapwing.lamp') ?? 1);
  } catch {
    // As bright as it comes.
  }
  if (lamp >= 0.15 && lamp < 1) document.documentElement.style.setProperty('--lamp', String(lamp));
  const scheme = document.querySelector('meta[name="color-scheme"]');
  scheme?.setAttribute('content', theme === 'light' ? 'light' : 'dark');
})();
