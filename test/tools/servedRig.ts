import type { ChildProcess } from 'node:child_process';
import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { SimulatedHands } from '../../server/calibrate/simulatedHands.js';
import { type RigAddress, rigAddress } from '../../server/loop/rigLock.js';
import { packageRoot } from '../../server/packageRoot.js';
import { lapwing, until } from './liveRig.js';

let made = 0;

/** `lapwing serve` on a simulated rig, wired as the demo's, in a folder of its own. Runs `dist/`. */
export class ServedRig {
  readonly folder = mkdtempSync(join(tmpdir(), 'lapwing-served-'));
  readonly rigPath = join(this.folder, 'rig.yaml');
  readonly address: RigAddress;
  hands!: SimulatedHands;
  url = '';
  said = '';
  readonly #service: ChildProcess;

  private constructor() {
    const name = `served ${process.pid} ${++made}`;
    this.address = rigAddress(name);
    const demo = readFileSync(join(packageRoot, 'hardware-sim/demo/rig.yaml'), 'utf8');
    // A short belt, so that laps come in a second or two.
    const text = demo
      .replace('rig: demo', `rig: ${name}`)
      .replace('length: 180 cm', 'length: 60 cm')
      .replace('rules_folder: sessions', 'rules_folder: .');
    writeFileSync(this.rigPath, text);
    writeFileSync(
      join(this.folder, 'rules.yaml'),
      'title: Each lap\nbelt: 60 cm\nrules:\n  water:\n    when: reaches 30 cm\n    do: give 4 uL\nend: lap > 900\n',
    );
    this.#service = lapwing('serve', '--rig', this.rigPath, '--port', '0');
    for (const stream of [this.#service.stdout!, this.#service.stderr!]) {
      stream.on('data', (bytes: Buffer) => {
        this.said += bytes.toString('utf8');
      });
    }
  }

  static async start(): Promise<ServedRig> {
    const rig = new ServedRig();
    const served = /http:\/\/127\.0\.0\.1:\d+/;
    await until(
      'the page',
      () => served.test(rig.said) || rig.#service.exitCode !== null,
      90_000,
      () => rig.said,
    );
    rig.url = served.exec(rig.said)?.[0] ?? '';
    if (rig.url === '') throw new Error(`the service left: ${rig.said}`);
    rig.hands = (await SimulatedHands.open(rig.address.handsPath))!;
    return rig;
  }

  /** How often each output has truly risen. */
  async rises(): Promise<readonly number[]> {
    return (await this.hands.say('state')).rises as number[];
  }

  async stop(): Promise<void> {
    this.hands?.close();
    const left = new Promise((resolve) => this.#service.once('close', resolve));
    if (this.#service.exitCode === null) this.#service.kill('SIGTERM');
    await left;
    rmSync(this.folder, { recursive: true, force: true });
  }
}
