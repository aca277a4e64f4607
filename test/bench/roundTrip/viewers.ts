import { type ChildProcess, fork } from 'node:child_process';
import { fileURLToPath } from 'node:url';
import { running } from './contestants.js';

/** What so many pages were told since they were last asked. */
export interface Heard {
  readonly messages: number;
  readonly bytes: number;
  /** Sockets that were closed from the other side. */
  readonly lost: number;
}

/** So many pages watching a service, without the pages, in a process of their own. */
export class Viewers {
  private constructor(private readonly child: ChildProcess) {}

  static async start(stream: string): Promise<Viewers> {
    const child = fork(fileURLToPath(new URL('./viewersProcess.js', import.meta.url)), [stream]);
    const viewers = new Viewers(child);
    await viewers.watch(0);
    return viewers;
  }

  /** Opens or closes pages until so many watch. */
  async watch(pages: number): Promise<void> {
    await this.ask({ watch: pages });
  }

  heard(): Promise<Heard> {
    return this.ask({ heard: true });
  }

  stop(): Promise<void> {
    return running(this.child).stop();
  }

  private ask(question: object): Promise<Heard> {
    return new Promise((resolve, reject) => {
      const left = () => reject(new Error('the viewers ended'));
      this.child.once('exit', left);
      this.child.once('message', (answer) => {
        this.child.off('exit', left);
        resolve(answer as Heard);
      });
      this.child.send(question);
    });
  }
}
