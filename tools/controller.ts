#!/usr/bin/env node
import { createSocket } from 'node:dgram';
import path from 'node:path';
import { parseArgs } from 'node:util';
import { ControllerEndpoint, type ControllerModule } from '../bridge/controller-side.js';
import { readBench } from '../configs/bench.js';
import { catalogue as library } from '../configs/catalogue.js';
import { startCanPeer } from './can-peer.js';
import { loadController } from './loop/controller-module.js';

/**
 * A controller as a process of its own: it knows the message map and nothing else of the bench. Live it answers each
 * trigger message at once; in lockstep (UDP only) it answers each `end` of the bench. On CAN it uses the package socketcan.
 *
 *   node dist/tools/controller.js BENCH [--lockstep] [--module FILE]
 */
const { values, positionals } = parseArgs({
  allowPositionals: true,
  options: {
    lockstep: { type: 'boolean', default: false },
    module: { type: 'string' },
    help: { type: 'boolean', default: false },
  },
});
const bench = positionals[0];
if (values.help || bench === undefined) {
  process.stdout.write(
    'Usage: controller BENCH [--lockstep] [--module FILE]\n\nRuns the controller module of a bench as a process of its own, over the links of the bench.\n',
  );
  process.exit(values.help ? 0 : 2);
}

try {
  await main(bench);
} catch (error) {
  process.stderr.write(`controller: ${error instanceof Error ? error.message : String(error)}\n`);
  process.exit(2);
}

async function main(file: string): Promise<void> {
  const spec = readBench(file, library);
  const moduleFile = values.module ?? spec.controller?.module;
  if (moduleFile === undefined) throw new Error('the bench names no controller module: give --module FILE');
  const factory = await loadController(path.dirname(file), moduleFile);
  const link = spec.map.links[0];
  if (!link) throw new Error('the bench has no link');
  if (link.kind !== 'udp') {
    if (values.lockstep)
      throw new Error(
        `link ${link.name} is CAN, which has no lockstep: run the bench with --pace live, or with --controller module`,
      );
    const peer = await startCanPeer(spec, factory);
    endWith(() => peer.close());
    return;
  }
  const socket = createSocket('udp4');
  const local = { address: link.remoteAddress ?? '127.0.0.1', port: link.remotePort ?? 0 };
  const bench = { address: link.localAddress ?? '127.0.0.1', port: link.localPort ?? 0 };
  let controller: ControllerModule | undefined;
  const endpoint = new ControllerEndpoint({
    map: spec.map,
    link: link.name,
    mode: values.lockstep ? 'lockstep' : 'live',
    send: (bytes, length) => socket.send(Uint8Array.from(bytes.subarray(0, length)), bench.port, bench.address),
    controller: {
      step: (tick, read, write) => controller!.step(tick, read, write),
      restart: () => controller!.restart?.(),
    },
  });
  controller = factory.createController(endpoint.mirror, spec.step);
  let heard = 0;
  socket.on('message', (bytes) => {
    heard = Date.now();
    endpoint.receive(bytes, bytes.length);
  });
  socket.on('error', (error: NodeJS.ErrnoException) => {
    const remedy = error.code === 'EADDRINUSE' ? ': another controller holds this port, end it or change the link' : '';
    process.stderr.write(`controller: ${error.message}${remedy}\n`);
    process.exit(2);
  });
  await new Promise<void>((resolve) => socket.bind(local.port, local.address, resolve));
  // A control unit on its own timer: says hello until the bench speaks, and goes on by itself when it falls silent.
  const every = 20;
  setInterval(() => {
    const silence = Date.now() - heard;
    if (heard === 0 || silence > 2000) endpoint.hello();
    else if (!values.lockstep && silence > every) endpoint.elapse(Math.round(every / 1000 / spec.step));
  }, every);
  endWith(() => socket.close());
}

/** Ends the process when it is asked to or its parent is gone. */
function endWith(close: () => void): void {
  const end = () => {
    close();
    process.exit(0);
  };
  for (const signal of ['SIGINT', 'SIGTERM'] as const) process.on(signal, end);
  process.on('disconnect', end);
}
