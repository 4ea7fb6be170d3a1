import { execFileSync, spawn } from 'node:child_process';
import type { CanSocket } from '../../../bridge/can-socket.js';

export function report(found: object): void {
  process.stdout.write(`report ${JSON.stringify(found)}\n`);
}

export function sh(command: string): string {
  return execFileSync('bash', ['-c', command], { encoding: 'utf8' });
}

export const sleep = (milliseconds: number): Promise<void> => new Promise((done) => setTimeout(done, milliseconds));

export const hex = (bytes: Uint8Array): string => Buffer.from(bytes).toString('hex');

/** All that waits on a socket, frames and notes, after `quiet` ms in which nothing came. */
export async function drain(socket: CanSocket, quiet = 300): Promise<string[]> {
  const heard: string[] = [];
  const into = new Uint8Array(72);
  for (let idle = 0; idle < quiet; ) {
    const size = socket.poll(into);
    if (size >= 0) {
      heard.push(hex(into.subarray(0, size)));
      idle = 0;
    } else {
      await sleep(10);
      idle += 10;
    }
  }
  return heard;
}

/** candump in its log form, started and known to listen; `stop` returns the frames as can-utils writes them. */
export async function capture(interfaceName = 'vcan0'): Promise<{ stop(): Promise<string[]> }> {
  const child = spawn('candump', ['-L', interfaceName], { stdio: ['ignore', 'pipe', 'inherit'] });
  let text = '';
  child.stdout.setEncoding('utf8').on('data', (chunk: string) => (text += chunk));
  // It listens once its first frame is seen: a frame of our own that no test looks at.
  for (let i = 0; i < 100 && !text.includes('7FE#'); i += 1) {
    sh(`cansend ${interfaceName} 7FE#`);
    await sleep(20);
  }
  if (!text.includes('7FE#')) throw new Error('candump does not listen');
  return {
    async stop() {
      await sleep(300);
      const gone = new Promise((done) => child.once('close', done));
      child.kill('SIGTERM');
      await gone;
      return text
        .split('\n')
        .map((line) => line.split(' ')[2] ?? '')
        .filter((frame) => frame !== '' && !frame.startsWith('7FE#'));
    },
  };
}
