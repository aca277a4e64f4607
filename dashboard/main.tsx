/**
 * The page's one loop: messages change what is known, and at most once per animation frame the page
 * is rendered and the canvases that changed are drawn.
 */
import { render } from 'preact';
import { Charts } from './draw/charts.js';
import { freshness, noteAwake } from './model/freshness.js';
import { emptyLive, take } from './model/live.js';
import { SoundWatch } from './model/sounds.js';
import { STOP_RETRY_MS, stopAsked, stopConfirmed, stopFailed, stopIdle } from './model/stop.js';
import { accessApi, leaveIfSignedOut } from './stream/accessApi.js';
import { type Answer, api } from './stream/api.js';
import { Connection } from './stream/connection.js';
import type { Actions, Theme } from './view/actions.js';
import { type BrowserSettings, recallSettings, setLamp } from './view/browserSettings.js';
import { listenForKeys, setKeymap, setSingleKeys } from './view/keys.js';
import { Page } from './view/page.js';
import { PageBook } from './view/pageBook.js';
import { Speaker } from './view/speaker.js';

const live = emptyLive();
const root = document.getElementById('page')!;
// The word that it is loading goes; what is rendered comes.
root.replaceChildren();
const still = matchMedia('(prefers-reduced-motion: reduce)');
const charts = new Charts(() => schedule());
let theme = (document.documentElement.dataset.theme ?? 'dark') as Theme;
const book = new PageBook({ touch, recall, keep });
let settings = recallSettings(recall);
const speaker = new Speaker();
const soundWatch = new SoundWatch();
let keys = recall('lapwing.keys') !== 'off';
let escapeHeld = false;
let changed = true;
let frame = 0;
let titleShown = '';

function schedule(): void {
  if (frame === 0) frame = requestAnimationFrame(paint);
}

function touch(): void {
  changed = true;
  schedule();
}

function paint(): void {
  frame = 0;
  const nowMs = performance.now();
  noteAwake(live, nowMs);
  if (changed) {
    changed = false;
    const page = book.current.name;
    const other = book.view({ live, nowMs, theme, actions });
    const shown = { live, nowMs, page, other, theme, keys, settings, escapeHeld, actions, charts };
    render(<Page {...shown} />, root);
    showTitle(nowMs);
  }
  const moving =
    !still.matches && live.state?.session === 'running' && freshness(live, nowMs).fresh;
  if (charts.draw(live, nowMs, moving)) schedule();
}

window.addEventListener('hashchange', () => void book.turnTo(location.hash));
window.addEventListener('beforeunload', (event) => {
  if (book.unsaved) event.preventDefault();
});

/** The tab says the lap, for whoever works in another one. */
function showTitle(nowMs: number): void {
  const { state } = live;
  const { fresh } = freshness(live, nowMs);
  const lap = state?.session === 'running' ? `Lap ${state.lap} · ${state.phase ?? ''} · ` : '';
  const where = book.current.load ? `${book.current.title} · ` : '';
  const title = `${fresh ? '' : '(stale) '}${lap}${where}Lapwing`;
  if (title === titleShown) return;
  titleShown = title;
  document.title = title;
}

function changeSettings(part: Partial<BrowserSettings>): void {
  settings = { ...settings, ...part };
  touch();
}

/** Within a key or a click; a browser lets a page sound only after one. */
async function wakeSpeaker(): Promise<void> {
  await speaker.wake();
  changeSettings({ soundBlocked: speaker.blocked });
}

for (const kind of ['pointerdown', 'keydown']) {
  window.addEventListener(kind, () => {
    if (settings.sounds.on && settings.soundBlocked) void wakeSpeaker();
  });
}

function soundAlarms(): void {
  const level = soundWatch.next(live.state?.alarms ?? [], settings.sounds, performance.now());
  if (level !== undefined) speaker.play(level, settings.sounds.volume);
}

async function asked(what: string, request: Promise<Answer>): Promise<Answer> {
  const answer = await request;
  live.notice = answer.done
    ? undefined
    : { kind: 'bad', text: `${what}: ${answer.text}`, remedy: answer.remedy };
  touch();
  return answer;
}

/** Over HTTP and over the stream at once; then again every second until the loop confirms. */
function stopEverything(): void {
  if (live.access.you?.role === 'viewer') {
    void stopAsViewer(live.access.you.mayHold);
    return;
  }
  live.stop = stopAsked(live.stop, performance.now());
  touch();
  connection.askQuiet();
  void api.quiet().then((answer) => {
    if (answer.done) stopDone();
    else live.stop = stopFailed(live.stop, answer.text);
    touch();
  });
}

/** A viewer cannot stop everything; what a viewer may do towards it is done. */
async function stopAsViewer(mayHold: boolean): Promise<void> {
  const held = mayHold && (await actions.act({ act: 'hold', what: 'stimulus', on: true })).done;
  live.notice = {
    kind: 'bad',
    text: held
      ? 'The stimulus is held, and nothing else: only an operator can stop everything from here.'
      : 'Nothing was stopped: only an operator can stop everything from here.',
    remedy: 'Call who is at the rig: the manual switch is there.',
  };
  touch();
}

function stopDone(): void {
  live.stop = stopConfirmed(live.stop, performance.now(), new Date().toLocaleTimeString());
}

setInterval(() => {
  if (live.stop.is === 'asking' && performance.now() - live.stop.sinceMs > STOP_RETRY_MS) {
    stopEverything();
  }
}, STOP_RETRY_MS);

const actions: Actions = {
  stopEverything,
  dismissStop: () => {
    live.stop = stopIdle;
    touch();
  },
  begin: (session) => asked('Not begun', api.begin(session)),
  end: (reason) => asked('Not ended', api.end(reason)),
  act: (act) => asked('Not done', api.act(act)),
  takeControls: (seen) => asked('The controls were not taken', accessApi.take(seen)),
  giveUpControls: () => asked('The controls were not given up', accessApi.giveUp()),
  signOut: async () => {
    await asked('Not signed out', accessApi.signOut());
    await leaveIfSignedOut();
  },
  setTheme: (name) => {
    theme = name;
    document.documentElement.dataset.theme = name;
    keep('lapwing.theme', name);
    charts.themeChanged();
    touch();
  },
  setKeys: (on) => {
    keys = on;
    setSingleKeys(on);
    keep('lapwing.keys', on ? 'on' : 'off');
    touch();
  },
  setLamp: (lamp) => {
    changeSettings({ lamp });
    setLamp(lamp);
    keep('lapwing.lamp', String(lamp));
  },
  setSounds: (sounds) => {
    changeSettings({ sounds });
    keep('lapwing.sounds', JSON.stringify(sounds));
    if (sounds.on) void wakeSpeaker();
  },
  trySound: (level) => {
    void wakeSpeaker().then(() => speaker.play(level, settings.sounds.volume));
  },
  setKeymap: (keymap) => {
    changeSettings({ keymap });
    setKeymap(keymap);
    keep('lapwing.keymap', JSON.stringify(keymap));
  },
  dismissNotice: () => {
    live.notice = undefined;
    touch();
  },
};

const stream = `${location.protocol === 'https:' ? 'wss' : 'ws'}://${location.host}/api/stream`;
const connection = new Connection(stream, {
  after: () => ({ number: live.lastEvent, life: live.life }),
  status: (status) => {
    live.stream = status;
    if (status === 'lost' && live.access.you?.signedIn !== false) void leaveIfSignedOut();
    touch();
  },
  message: (message) => {
    if (message.tell === 'quiet') {
      if (message.done) stopDone();
      else live.stop = stopFailed(live.stop, message.detail);
    } else {
      take(live, message, performance.now());
      if (message.tell === 'state') soundAlarms();
    }
    touch();
  },
});

// While nothing arrives, the age of what is shown must still grow.
setInterval(() => {
  const nowMs = performance.now();
  noteAwake(live, nowMs);
  if (live.stop.is === 'asking' || !freshness(live, nowMs).fresh) touch();
}, 200);

function recall(name: string): string | null {
  try {
    return localStorage.getItem(name);
  } catch {
    return null;
  }
}

function keep(name: string, value: string): void {
  try {
    localStorage.setItem(name, value);
  } catch {
    // Without storage the choice lasts as long as the page.
  }
}

setSingleKeys(keys);
setKeymap(settings.keymap);
setLamp(settings.lamp);
if (settings.sounds.on) void wakeSpeaker();
listenForKeys(stopEverything, (is) => {
  escapeHeld = is;
  touch();
});
connection.open();
void book.turnTo(location.hash);
schedule();
