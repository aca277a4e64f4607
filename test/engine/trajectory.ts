import type { Stage } from './stage.js';

/**
 * The fixed path that the twelve sessions are run on. `expected/make.py` has the same path, written
 * again from this description:
 *
 * A frame every 10 ms, 25 counts to a centimetre, 4500 to a lap; the belt starts at 170 cm of the
 * part lap 0. On lap n the animal cruises at 5, 8, 4 or 6 counts a frame (n mod 4 = 0, 1, 2, 3),
 * from 70 to 84 cm at 3 at most.
 *
 * - At the first frame at or past 92 cm it stands for 40 frames; on laps that 3 does not divide it
 *   licks at the 5th, 17th and 29th of them, except on laps 40 to 49.
 * - On laps that 5 divides it stands for 250 frames at the first frame at or past 120 cm, and licks
 *   at the 10th, 22nd, 34th, 46th and 58th.
 * - On laps that 7 divides it backs up at 2 counts a frame for 50 frames once it is at or past 60 cm.
 * - From lap 8 to 29 it licks at the first frame at or past 75, 76 ... 82 cm; from lap 30 on at the
 *   first frame at or past 132, 135 ... 159 cm.
 * - The spike detector's line rises at every frame that 137 divides, and falls 5 frames later.
 * - The operator presses `drop` at every frame that 2500 divides (not the first) and 200 frames
 *   later, chooses `light_at` 100 cm at frame 20,000 and 30 cm at frame 60,000.
 */
export function followTrajectory(stage: Stage, frames: number): void {
  let spoutDone = false;
  let restDone = false;
  let backDone = false;
  let ladder = 0;
  let dwell: { readonly frames: number; readonly licks: readonly number[]; at: number } | undefined;
  let backing = 0;
  stage.begin();
  for (let frame = 1; frame < frames && stage.ended === ''; frame++) {
    const { lap } = stage.instant;
    const counts = stage.travel - lap * 4500;
    if (stage.instant.lapBegan) {
      spoutDone = false;
      restDone = false;
      backDone = false;
      ladder = 0;
    }

    let lick = false;
    if (dwell === undefined && lap >= 1) {
      if (!spoutDone && counts >= 92 * 25) {
        spoutDone = true;
        const silent = lap % 3 === 0 || (lap >= 40 && lap <= 49);
        dwell = { frames: 40, licks: silent ? [] : [5, 17, 29], at: 0 };
      } else if (lap % 5 === 0 && !restDone && counts >= 120 * 25) {
        restDone = true;
        dwell = { frames: 250, licks: [10, 22, 34, 46, 58], at: 0 };
      }
    }
    if (lap >= 1 && lap % 7 === 0 && !backDone && counts >= 60 * 25) {
      backDone = true;
      backing = 50;
    }
    const [first, apart, rungs] = lap < 8 ? [0, 0, 0] : lap < 30 ? [75, 1, 8] : [132, 3, 10];
    for (; ladder < rungs && counts >= (first + apart * ladder) * 25; ladder++) lick = true;

    let step = [5, 8, 4, 6][lap % 4]!;
    if (counts >= 70 * 25 && counts < 84 * 25) step = Math.min(step, 3);
    if (backing > 0) {
      step = -2;
      backing--;
    }
    if (dwell) {
      step = 0;
      dwell.at++;
      if (dwell.licks.includes(dwell.at)) lick = true;
      if (dwell.at === dwell.frames) dwell = undefined;
    }
    if (lick) stage.lickAtNextFrame();
    if (frame % 137 === 0) stage.inputAtNextFrame(2, true);
    if (frame > 137 && frame % 137 === 5) stage.inputAtNextFrame(2, false);
    if (frame % 2500 === 0 || (frame > 2500 && frame % 2500 === 200)) stage.engine.press('drop');
    if (frame === 20_000) stage.engine.choose('light_at', 100);
    if (frame === 60_000) stage.engine.choose('light_at', 30);
    stage.frame(step);
  }
}
