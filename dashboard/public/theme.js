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
  const scheme = document.querySelector('meta[name="color-scheme"]');
  scheme?.setAttribute('content', theme === 'light' ? 'light' : 'dark');
})();
