#!/usr/bin/env python3
"""Works out what the twelve sessions should fire on the fixed path of `test/engine/trajectory.ts`.

Written from the language's description alone, session by session, each as the plain loop that a
person would write for that one experiment; it shares no code with the engine. Standard library only.

    python3 test/engine/expected/make.py      writes 01.csv ... 12.csv beside this file

A row is a firing: rule, real or sham, lap, place in cm (empty before lap 1), session time in ms.
"""
import csv
import os

FRAMES = 110_000
LAP = 4500
CM = 25
SEED = 'seed'
HERE = os.path.dirname(os.path.abspath(__file__))
SESSIONS = os.path.join(HERE, '..', '..', '..', 'hardware-sim', 'demo', 'sessions')


# ---- chance: MurmurHash3_x86_32, twice, for 53 bits ---------------------------------------------

def murmur3(data, seed):
    mask = 0xFFFFFFFF

    def rotl(x, r):
        return ((x << r) | (x >> (32 - r))) & mask

    def scramble(k):
        return rotl(k * 0xCC9E2D51 & mask, 15) * 0x1B873593 & mask

    h = seed
    whole = len(data) // 4 * 4
    for at in range(0, whole, 4):
        h = rotl(h ^ scramble(int.from_bytes(data[at:at + 4], 'little')), 13) * 5 + 0xE6546B64 & mask
    if len(data) > whole:
        h ^= scramble(int.from_bytes(data[whole:], 'little'))
    h ^= len(data)
    h = (h ^ h >> 16) * 0x85EBCA6B & mask
    h = (h ^ h >> 13) * 0xC2B2AE35 & mask
    return h ^ h >> 16


def uniform(name, scope, index, attempt=0):
    key = f'{SEED}\n{name}\n{scope}\n{index}\n{attempt}'.encode()
    bits = (murmur3(key, 0x6C617077) >> 5) * 2 ** 26 + (murmur3(key, 0x696E6721) >> 6)
    return bits / 2 ** 53


# ---- the path -----------------------------------------------------------------------------------

class Frame:
    """What one frame shows: position in counts (None before lap 1), the way there, and events."""
    __slots__ = ('n', 'ms', 'lap', 'began', 'travel', 'before', 'furthest', 'furthest_before',
                 'speed', 'lick', 'rise', 'press', 'choose')

    @property
    def counts(self):
        return self.travel % LAP if self.lap >= 1 else None

    def within(self, low_cm, high_cm):
        return self.lap >= 1 and low_cm * CM <= self.counts < high_cm * CM

    def reaches(self, counts):
        """The furthest point of this lap passes a place."""
        place = self.lap * LAP + counts
        before = self.furthest_before
        if self.began and self.lap == 1:
            before = LAP - 1
        return self.lap >= 1 and before < place <= self.furthest


def path():
    travel = furthest = 170 * CM
    lap = 0
    done = set()
    dwell = None
    backing = 0
    began = False
    for n in range(FRAMES):
        frame = Frame()
        frame.n, frame.ms = n, n * 10
        frame.lick = frame.rise = frame.press = False
        frame.choose = None
        frame.before, frame.furthest_before = travel, furthest
        step = 0
        if n > 0:
            if began:
                done = set()
            counts = travel - lap * LAP

            def once(what, cm):
                if lap < 1 or counts < cm * CM or what in done:
                    return False
                done.add(what)
                return True

            if dwell is None:
                if once('spout', 92):
                    dwell = [0, 40, () if lap % 3 == 0 or 40 <= lap <= 49 else (5, 17, 29)]
                elif lap % 5 == 0 and once('rest', 120):
                    dwell = [0, 250, (10, 22, 34, 46, 58)]
            if lap % 7 == 0 and once('back', 60):
                backing = 50
            if 8 <= lap < 30:
                for k in range(8):
                    if once(('a', k), 75 + k):
                        frame.lick = True
            if lap >= 30:
                for k in range(10):
                    if once(('b', k), 132 + 3 * k):
                        frame.lick = True
            step = (5, 8, 4, 6)[lap % 4]
            if 70 * CM <= counts < 84 * CM:
                step = min(step, 3)
            if backing > 0:
                step = -2
                backing -= 1
            if dwell:
                step = 0
                dwell[0] += 1
                if dwell[0] in dwell[2]:
                    frame.lick = True
                if dwell[0] == dwell[1]:
                    dwell = None
            frame.rise = n % 137 == 0
            frame.press = n % 2500 == 0 or (n > 2500 and n % 2500 == 200)
            frame.choose = {20_000: 100, 60_000: 30}.get(n)
        travel += step
        furthest = max(furthest, travel)
        began = furthest // LAP > lap
        lap = furthest // LAP
        frame.lap, frame.began = lap, began
        frame.travel, frame.furthest = travel, furthest
        frame.speed = step * 4  # counts a frame of 10 ms, 25 to a cm: 4 cm/s each
        yield frame


class Log:
    def __init__(self):
        self.rows = []

    def fire(self, rule, frame, sham=False):
        place = '' if frame.lap < 1 else f'{frame.counts / CM:.2f}'
        self.rows.append([rule, 'sham' if sham else 'real', frame.lap, place, frame.ms])

    def count(self, rule):
        return sum(1 for row in self.rows if row[0] == rule)


# ---- the sessions -------------------------------------------------------------------------------

def s01(log):
    given = 0
    for f in path():
        if given >= 1000 or f.ms >= 3_600_000:
            return
        if f.reaches(90 * CM):
            log.fire('water', f)
            given += 4


def s02(log):
    for f in path():
        # Fifty whole laps each: `moved` begins as lap 51 does, and the session ends as lap 101 does.
        if f.lap >= 101:
            return
        if f.reaches((60 if f.lap <= 50 else 140) * CM):
            log.fire('water', f)


def s03(log):
    last = None
    place = None
    index = 0
    for f in path():
        if f.began:
            # On a lattice of 0.1 mm, from 20 to 160 cm, at least 40 cm from the last either way.
            def far(v):
                d = abs(v - last)
                return min(d, 18_000 - d) >= 4_000
            allowed = [v for v in range(2_000, 16_001) if last is None or far(v)]
            last = allowed[int(uniform('water_at', 'every lap', index) * len(allowed))]
            index += 1
            place = int(last / 100 * CM + 0.5)
        if place is not None and f.reaches(place):
            log.fire('water', f)
        if f.began:
            log.fire('lap_mark', f)


def s04(log):
    given = 0
    earned, free = {}, {}  # by lap
    for f in path():
        if given >= 1000:
            return
        if f.reaches(85 * CM) and f.lap >= 4:
            three = range(f.lap - 3, f.lap)
            if not any(earned.get(n) or free.get(n) for n in three):
                log.fire('free', f)
                free[f.lap] = 1
                given += 4
        if f.lick and f.within(85, 95) and not free.get(f.lap) and not earned.get(f.lap):
            log.fire('earned', f)
            earned[f.lap] = 1
            given += 4


def s05(log):
    for f in path():
        if f.lap >= 131:
            return
        if f.reaches(90 * CM):
            log.fire('water', f, sham=f.lap > 30 and f.lap % 10 == 0)


def block_of_ten(number):
    """Five of each (0: stim, 1: sham), Fisher and Yates, tried again while a run exceeds three."""
    block = [0] * 5 + [1] * 5
    for attempt in range(64):
        for n in range(9, 0, -1):
            other = int(uniform('kind', f'block {number}', n, attempt) * (n + 1))
            block[n], block[other] = block[other], block[n]
        text = ''.join(map(str, block))
        if '0000' not in text and '1111' not in text:
            return block
    raise SystemExit('the block needs more tries than this script makes')


def s06(log):
    # The value drawn at the start, from block 1, is never used: a new phase starts a new block.
    kinds = block_of_ten(2)
    fired = 0
    last_lap = None
    done_on = None
    speed_before = 0
    for f in path():
        if done_on is None and fired == 10:
            done_on = f.lap
        # Induction runs from lap 20 to the end of the lap of the tenth firing; then 20 laps more.
        if done_on is not None and f.lap >= done_on + 21:
            return
        if f.reaches(90 * CM):
            log.fire('water', f)
        induction = f.lap >= 20 and (done_on is None or f.lap <= done_on)
        # The last frame before the crossing counts.
        if f.reaches(45 * CM) and induction and speed_before >= 8 and last_lap != f.lap and fired < 10:
            log.fire('induce', f, sham=kinds[fired] == 1)
            fired += 1
            last_lap = f.lap
        speed_before = f.speed


def s07(log):
    light_at, chosen = 45, None
    last_press = None
    last_lap = None
    lights = 0
    for f in path():
        if f.ms >= 1_800_000:
            return
        if f.choose:
            chosen = f.choose
        if f.began and chosen:
            light_at, chosen = chosen, None
        # Entering going forwards is the first entering of a lap, and there is one a lap.
        if f.reaches(light_at * CM) and last_lap != f.lap and lights < 60:
            log.fire('light', f)
            last_lap = f.lap
            lights += 1
        if f.press and (last_press is None or f.ms - last_press >= 5_000):
            log.fire('extra_drop', f)
            last_press = f.ms


def s08(log):
    steps = []  # counts moved, by frame
    mean_before = speed_before = 0
    still_since = None
    woken = False
    last_wake = None
    lights = 0
    for f in path():
        steps.append(f.travel - f.before)
        if f.reaches(90 * CM):
            log.fire('water', f)
        if f.reaches(60 * CM) and speed_before >= 10 and mean_before >= 8 and lights < 100:
            log.fire('light', f)
            lights += 1
        if f.speed == 0 and f.lap >= 1 and not f.within(85, 100):
            if still_since is None:
                still_since, woken = f.ms, False
            if not woken and f.ms - still_since >= 2_000:
                woken = True
                if last_wake is None or f.ms - last_wake >= 10_000:
                    log.fire('wake', f)
                    last_wake = f.ms
        else:
            still_since = None
        # The last 100 frames of 10 ms.
        mean_before = sum(steps[-100:]) / CM if len(steps) > 100 else 0
        speed_before = f.speed


def s09(log):
    visit_licks = None
    inside = False
    due = []
    lights_on = set()
    times = []  # of licks
    for f in path():
        if f.reaches(90 * CM):
            log.fire('water', f)
        now_inside = f.within(85, 100)
        if now_inside and not inside:
            visit_licks = 0
        inside = now_inside
        bout = False
        if f.lick:
            if inside:
                visit_licks += 1
                if visit_licks == 3:
                    due.append(f.ms + 500)
            times.append(f.ms)
            # Five within a second now, and not yet before this one.
            full = len(times) >= 5 and times[-5] >= f.ms - 1_000
            before = len(times) >= 6 and times[-6] >= f.ms - 1_000
            bout = full and not before
        for ms in [d for d in due if d <= f.ms]:
            due.remove(ms)
            if inside and f.lap not in lights_on and len(lights_on) < 100:
                log.fire('light', f)
                lights_on.add(f.lap)
        if bout and f.lap >= 1 and not inside:
            log.fire('burst', f)


def s10(log):
    drops = []
    gap_index = 0

    def gap():
        return 500_000 + int(uniform('gap', 'every firing', gap_index) * 4_500_001)

    due_us = gap()
    for f in path():
        if len(drops) * 2 >= 600:
            return
        if f.rise and f.speed > 2:
            lately = [ms for ms in drops if ms > f.ms - 300_000]
            if (not drops or f.ms - drops[-1] >= 2_000) and len(lately) < 20:
                log.fire('water', f)
                drops.append(f.ms)
        if f.ms * 1000 >= due_us:
            log.fire('clock', f)
            gap_index += 1
            due_us += gap()


def s11(log):
    with open(os.path.join(SESSIONS, 'm12-earned.csv')) as file:
        rows = [(int(r['lap']), int(float(r['place_cm']) * CM + 0.5)) for r in csv.DictReader(file)]
    for f in path():
        if f.lap >= 121:
            return
        for lap, counts in rows:
            if f.lap == lap and f.reaches(counts):
                log.fire('water', f)


def s12(log):
    phase, began = 'first', 0  # the last lap before its first whole one
    licks, before = {}, {}  # by lap
    began_ms = 0
    chance = 0
    water = 0
    for f in path():
        spot = 90 if phase == 'first' else 160
        if water * 4 >= 1000:
            return
        if f.began and phase in ('first', 'second') and f.lap - 1 - began >= 10:
            ten = range(f.lap - 10, f.lap)
            total = sum(licks.get(n, 0) for n in ten)
            if total and sum(before.get(n, 0) for n in ten) / total > 0.7:
                phase = 'second' if phase == 'first' else 'hold_out'
                began, began_ms = f.lap - 1, f.ms
        elif f.began and phase == 'hold_out':
            if f.lap - 1 - began >= 20 or f.ms - began_ms >= 900_000:
                return
        if f.lick:
            licks[f.lap] = licks.get(f.lap, 0) + 1
            if f.within(spot - 30, spot):
                before[f.lap] = before.get(f.lap, 0) + 1
        spot = 90 if phase == 'first' else 160
        if f.reaches(spot * CM):
            if phase != 'hold_out':
                log.fire('water', f)
                water += 1
            else:
                if uniform('probe_drop', 'chance', chance) < 0.5:
                    log.fire('probe_drop', f)
                    water += 1
                chance += 1


def main():
    for number, session in enumerate((s01, s02, s03, s04, s05, s06, s07, s08, s09, s10, s11, s12), 1):
        log = Log()
        session(log)
        with open(os.path.join(HERE, f'{number:02}.csv'), 'w', newline='') as file:
            writer = csv.writer(file, lineterminator='\n')
            writer.writerow(['rule', 'kind', 'lap', 'place_cm', 'time_ms'])
            writer.writerows(log.rows)


if __name__ == '__main__':
    main()
