/** Where the source decides something: files that are changed, and the tests that must notice. */
export const parts = {
  verdict: { mutate: ['runtime/verdict.ts'], tests: ['tests/runtime/verdict.test.ts'] },
  watch: {
    mutate: ['runtime/watch.ts', 'runtime/watch-ladders.ts', 'runtime/watch-levels.ts'],
    tests: ['tests/runtime/watch.test.ts'],
  },
  judge: {
    mutate: [
      'runtime/judge/offline.ts',
      'runtime/judge/program.ts',
      'runtime/judge/window.ts',
      'runtime/judge/outermost.ts',
    ],
    tests: ['tests/runtime/judge/*.test.ts'],
  },
  recording: {
    mutate: ['runtime/recording/unpack.ts', 'runtime/recording/decode-block.ts', 'runtime/recording/reader.ts'],
    tests: ['tests/runtime/recording/damage.test.ts', 'tests/runtime/recording/recording.test.ts'],
  },
  codecs: {
    mutate: ['bridge/udp-codec.ts', 'bridge/can-codec.ts', 'bridge/can-datagram.ts'],
    tests: [
      'tests/bridge/udp-codec.test.ts',
      'tests/bridge/can-codec.test.ts',
      'tests/bridge/can-datagram.test.ts',
      'tests/bridge/exchange.test.ts',
    ],
  },
  solver: {
    mutate: ['runtime/solver/rodas3.ts'],
    tests: ['tests/published/stiff-problems.test.ts', 'tests/runtime/circuit/*.test.ts'],
  },
  ledger: {
    mutate: ['runtime/tick.ts', 'runtime/energy-parts.ts'],
    tests: ['tests/plants/falsified.test.ts', 'tests/system/truck.test.ts'],
  },
};
