import { execFileSync, spawnSync } from 'node:child_process';
import { createHash } from 'node:crypto';
import { existsSync, readdirSync, readFileSync } from 'node:fs';
import { join } from 'node:path';
import { afterAll, beforeAll, describe, expect, it, onTestFinished } from 'vitest';
import { firingsOf } from '../../server/analysis/firings.js';
import { dropsOf, lapsOf, licksOf, phasesOf } from '../../server/analysis/happenings.js';
import { countsByLap } from '../../server/analysis/lapCounts.js';
import { readSession, type SessionData } from '../../server/analysis/readSession.js';
import { toldOf } from '../../server/analysis/told.js';
import { exportNwb } from '../../server/export/nwb/exportNwb.js';
import { writeNwb } from '../../server/export/nwb/writeNwb.js';
import { packageRoot } from '../../server/packageRoot.js';
import { updateDescription } from '../../server/session/description.js';
import { recordedSession } from '../analysis/recorded.js';

// Debian's Python has the readers; another python3 on the path may not.
const PYTHON = existsSync('/usr/bin/python3') ? '/usr/bin/python3' : 'python3';
const readers = spawnSync(PYTHON, ['-c', 'import hdmf, h5py']).status === 0;
const NOTICE =
  'notice: python3-hdmf and python3-h5py are not installed, so this file is not read back';

const recorded = recordedSession({ minutes: 6, acts: [{ act: 'note', text: 'a µm, "so"' }] });
afterAll(() => recorded.remove());
const file = join(recorded.root, 'session.nwb');
const CREATED = '2026-03-05T10:00:00.000+00:00';
let session: SessionData;
beforeAll(async () => {
  session = await readSession(recorded.folder);
  await writeNwb(session, file, CREATED);
});

/** What h5py finds: microseconds as whole numbers, and digests of the long columns. */
const CODE = `
import sys, json, hashlib, h5py, numpy as np
f = h5py.File(sys.argv[1], "r")
us = lambda a: np.rint(a[()] * 1e6).astype("<i8")
sha = lambda a: hashlib.sha256(a.tobytes()).hexdigest()
text = lambda d: [v.decode() for v in d[()]]
um = lambda d: [None if np.isnan(v) else int(np.rint(v * 1e6)) for v in d[()]]
things = []
f.visititems(lambda n, o: things.append((n, o)))
needs = lambda o: o.attrs["neurodata_type"] in ("TimeSeries", "SpatialSeries", "EventsTable", "TimeIntervals", "VectorData", "TimestampVectorData", "DurationVectorData", "Device", "ProcessingModule")
e, beh = f["events"], f["processing/behavior"]
out = {
  "samples": len(f["acquisition/belt_encoder/data"]),
  "sampleUs": sha(us(f["acquisition/belt_encoder/timestamps"])),
  "counts": sha(f["acquisition/belt_encoder/data"][()].astype("<i4")),
  "position": sha(beh["Position/belt_position/data"][()].astype("<f8")),
  "sharedTimes": f["acquisition/belt_encoder/timestamps"] == beh["BehavioralTimeSeries/speed/timestamps"],
  "lickUs": us(e["licks/timestamp"]).tolist(),
  "dropUs": us(e["water/timestamp"]).tolist(), "openUs": us(e["water/duration"]).tolist(),
  "volumeNl": np.rint(e["water/volume"][()] * 1e3).astype(int).tolist(),
  "firingUs": us(e["firings/timestamp"]).tolist(), "firingRule": text(e["firings/rule"]),
  "sham": e["firings/sham"][()].tolist(), "armed": e["firings/armed"][()].tolist(),
  "decidedUs": us(e["firings/decided"]).tolist(),
  "placeUm": um(e["firings/place"]), "riseUm": um(e["firings/rise"]), "correctedUm": um(e["firings/corrected"]),
  "inputs": [e[t + "/input"][()].tolist() for t in ("licks", "water", "firings")],
  "speed": sha(beh["BehavioralTimeSeries/speed/data"][()].astype("<f8")),
  "lapAt": sha(beh["BehavioralTimeSeries/lap/data"][()].astype("<i4")),
  "trust": sha(beh["BehavioralTimeSeries/position_trust/data"][()]),
  "units": [d.attrs["unit"] for d in (f["acquisition/belt_encoder/data"], beh["Position/belt_position/data"],
    beh["BehavioralTimeSeries/speed/data"], e["licks/timestamp"])],
  "lapLicks": f["intervals/laps/licks"][()].tolist(), "lapFirings": f["intervals/laps/firings"][()].tolist(),
  "lapNl": np.rint(f["intervals/laps/water"][()] * 1e3).astype(int).tolist(),
  "phases": list(zip(text(f["intervals/phases/phase"]), us(f["intervals/phases/start_time"]).tolist())),
  "decisions": list(zip(text(e["decisions/what"]), e["decisions/input"][()].tolist())),
  "rig": f["scratch/rig_file"][()].decode(), "device": f["general/devices/treadmill"].attrs["description"],
  "model": f["general/devices/treadmill"].get("model", getlink=True).path,
  "core": json.loads(f[f.attrs[".specloc"]]["core/2.10.0/namespace"][()])["namespaces"][0]["version"],
  "eventSchema": json.loads(f["specifications/core/2.10.0/nwb.event"][()])["groups"][0]["neurodata_type_def"],
  "undescribed": [n for n, o in things if "neurodata_type" in o.attrs and needs(o) and not o.attrs.get("description")],
  "gateUs": us(f["stimulus/presentation/gate/timestamps"]).tolist(),
  "lapUs": us(f["intervals/laps/start_time"]).tolist(), "lap": f["intervals/laps/lap"][()].tolist(),
  "rules": f["scratch/rules_file"][()].decode(), "subject": f["general/subject/subject_id"][()].decode(),
  "seamUs": us(e["line_seam/timestamp"]).tolist(),
  "notes": [d for d, w in zip(text(e["decisions/detail"]), text(e["decisions/what"])) if w == "note"],
  "start": f["session_start_time"][()].decode(),
}
print(json.dumps(out, default=bool))`;

const since = (us: number) => us - session.beganUs;
const sha = (bytes: ArrayBufferView) =>
  createHash('sha256')
    .update(new Uint8Array(bytes.buffer, bytes.byteOffset, bytes.byteLength))
    .digest('hex');

// Python and a process of its own take seconds on a busy machine.
describe('an NWB file', { timeout: 120_000 }, () => {
  it("has no error by the standard's own schema", () => {
    if (!readers) {
      console.log(NOTICE);
      return;
    }
    const script = join(packageRoot, 'test', 'export', 'nwb', 'validate_nwb.py');
    const { stdout, stderr } = spawnSync(PYTHON, ['-B', script, file], { encoding: 'utf8' });
    expect(stdout, stderr).toMatch(/\n0 errors\n$/);
    expect(stdout).toContain('nwb_version 2.10.0');
  });

  it('equals the record to the microsecond and the count when h5py reads it', () => {
    if (!readers) {
      console.log(NOTICE);
      return;
    }
    const found = JSON.parse(
      execFileSync(PYTHON, ['-B', '-c', CODE, file], { encoding: 'utf8', maxBuffer: 1 << 26 }),
    );
    const { samples, description } = session;
    const n = samples.length;
    const sampleUs = BigInt64Array.from({ length: n }, (_, i) =>
      BigInt(since(samples.boardUs[i]!)),
    );
    const firings = firingsOf(session);
    const drops = dropsOf(session);
    const laps = lapsOf(session);
    const countsOf = countsByLap(session);
    const micrometres = (cm: number | null) => (cm === null ? null : Math.round(cm * 1e4));
    expect(found).toEqual({
      samples: n,
      sampleUs: sha(sampleUs),
      counts: sha(samples.count.slice(0, n)),
      position: sha(samples.positionCm.slice(0, n).map((cm) => cm / 100)),
      sharedTimes: true,
      lickUs: licksOf(session).map((lick) => since(lick.boardUs)),
      dropUs: drops.map((drop) => since(drop.boardUs)),
      openUs: drops.map((drop) => drop.openUs),
      volumeNl: drops.map((drop) => Math.round(drop.volumeUl * 1_000)),
      firingUs: firings.map((firing) => since(firing.boardUs)),
      firingRule: firings.map((firing) => firing.rule),
      sham: firings.map((firing) => Number(firing.sham)),
      armed: firings.map((firing) => Number(firing.armed)),
      decidedUs: firings.map((firing) => since(firing.decidedUs)),
      placeUm: firings.map((firing) => micrometres(firing.placeCm)),
      riseUm: firings.map((firing) => micrometres(firing.riseCm)),
      correctedUm: firings.map((firing) => micrometres(firing.correctedCm)),
      inputs: [licksOf(session), drops, firings].map((rows) => rows.map(({ input }) => input)),
      speed: sha(samples.speedCmPerS.slice(0, n).map((cm) => cm / 100)),
      lapAt: sha(samples.lap.slice(0, n)),
      trust: sha(samples.trust.slice(0, n)),
      units: ['counts', 'meters', 'm/s', 'seconds'],
      lapLicks: laps.map(({ lap }) => countsOf(lap).licks),
      lapFirings: laps.map(({ lap }) => countsOf(lap).firings),
      lapNl: laps.map(({ lap }) => Math.round(countsOf(lap).waterUl * 1_000)),
      phases: phasesOf(session).map(({ phase, startUs }) => [phase, since(startUs)]),
      decisions: toldOf(session).map(({ kind, input }) => [kind, input]),
      rig: readFileSync(join(recorded.folder, 'rig.yaml'), 'utf8'),
      device: expect.stringContaining(session.rig.name),
      model: '/general/devices/models/belt_rig',
      core: '2.10.0',
      eventSchema: 'EventsTable',
      undescribed: [],
      gateUs: firings
        .filter(({ output }) => output === 'gate')
        .flatMap(({ spans }) => spans.flatMap(({ fromUs, toUs }) => [since(fromUs), since(toUs)])),
      lapUs: laps.map((lap) => since(lap.startUs)),
      lap: laps.map((lap) => lap.lap),
      rules: readFileSync(join(recorded.folder, 'rules.yaml'), 'utf8'),
      subject: 'm07',
      seamUs: session.edges.filter((e) => e.name === 'seam').map((e) => since(e.boardUs)),
      notes: session.decisions.flatMap((d) => (d.kind === 'note' ? [d.text] : [])),
      start: description.startedAt,
    });
    expect(found.notes).toContain('a µm, "so"');
    expect(found.gateUs.length).toBeGreaterThan(2);
  });

  it('is the same bytes again, but for the date of its making', async () => {
    const again = join(recorded.root, 'again.nwb');
    await writeNwb(session, again, CREATED);
    expect(readFileSync(again).equals(readFileSync(file))).toBe(true);
    expect(readdirSync(recorded.root).filter((name) => name.endsWith('.new'))).toEqual([]);
  });

  it('that cannot be written leaves nothing behind and says so', async () => {
    const nowhere = join(recorded.root, 'no', 'such', 'folder.nwb');
    await expect(writeNwb(session, nowhere, CREATED)).rejects.toMatchObject({
      code: 'EXPORT_FOLDER_BAD',
    });
  });

  it('is written by a process of its own, which says how far it is', async () => {
    const path = join(recorded.root, 'child.nwb');
    const told: number[] = [];
    expect(await exportNwb(recorded.folder, path, (done) => told.push(done))).toBe(path);
    expect(told.length).toBeGreaterThanOrEqual(4);
    expect(told).toEqual([...told].sort((a, b) => a - b));
    expect(told.at(-1)).toBeGreaterThan(0.9);
    expect(told.at(-1)).toBeLessThanOrEqual(1);
    // HDF5's own signature (HDF5 file format specification, superblock).
    expect(readFileSync(path).subarray(0, 8)).toEqual(Buffer.from('\x89HDF\r\n\x1a\n', 'latin1'));
    await expect(exportNwb(join(recorded.root, 'none'), path)).rejects.toMatchObject({
      code: 'RECORD_DESCRIPTION_BAD',
    });
  });

  it('holds what the rules file brought in, and what the animal weighed', async () => {
    const yoked = recordedSession({ rules: '11-yoked-control.yaml', minutes: 1 });
    const animal = {
      ...{ folder: '/animals', rig: 'demo', kept: true, weightG: 21.45, percent: 91 },
      ...{ leastPercent: 80, protocol: 'P-2026-014', targetUl: 1_000, against: [] },
    };
    updateDescription(yoked.folder, { animal, sessionNumber: 12, protocolNumber: 'P-2026-014' });
    const path = join(yoked.root, 'yoked.nwb');
    await writeNwb(await readSession(yoked.folder), path, CREATED);
    const table = readFileSync(join(yoked.folder, 'm12-earned.csv'), 'utf8');
    onTestFinished(() => yoked.remove());
    if (!readers) {
      console.log(NOTICE);
      return;
    }
    const code = `
import sys, json, h5py
f = h5py.File(sys.argv[1], "r")
t = lambda p: f[p][()].decode()
print(json.dumps({"table": t("scratch/included_file_1"), "weight": t("general/subject/weight"),
  "protocol": t("general/protocol"), "notes": t("general/notes")}))`;
    const found = JSON.parse(execFileSync(PYTHON, ['-B', '-c', code, path], { encoding: 'utf8' }));
    expect(found).toMatchObject({ table, weight: '0.02145 kg', protocol: 'P-2026-014' });
    expect(found.notes).toContain('Session 12 of this subject.');
  });

  it('of a session in which nothing happened is valid too', async () => {
    const rules =
      'title: Nothing\nbelt: 180 cm\nrules:\n  none:\n    when: session begins\n    do: note\nend: time >= 2 s\n';
    const empty = recordedSession({ rules, minutes: 1, simulated: { startCm: 20 } });
    const path = join(empty.root, 'empty.nwb');
    await writeNwb(await readSession(empty.folder), path, CREATED);
    const script = join(packageRoot, 'test', 'export', 'nwb', 'validate_nwb.py');
    if (readers)
      expect(spawnSync(PYTHON, ['-B', script, path], { encoding: 'utf8' }).stdout).toMatch(
        /\n0 errors\n$/,
      );
    else console.log(NOTICE);
    empty.remove();
  });
});
