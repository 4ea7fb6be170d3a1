/** A small hydraulic bench in which each kind of statement occurs once. */
export const smallBench = `bench: small circuit
about: two lines and a machine
step: 1 ms
substeps: 4
ambient: { temperature: 25 degC }
budgets: { lateness: 150 us, lostFrames: 0.2 % }
fluids:
  oil: { is: oil, grade: VG 46, air: 0.5 % }
stores:
  highAccumulator: { is: accumulator, volume: 50 L, precharge: 150 bar(g) at 20 degC, separator: bladder }
  highLine:
    is: volume
    fluid: oil
    volume: 0.8 L
    maximumAllowable: 350 bar(g)
    start: { pressure: 200 bar(g), temperature: 40 degC }
  lowLine: { is: volume, volume: 2 L }
  propShaft: { is: shaft, inertia: 0.9 kg m2 }
branches:
  isolation: { is: valve, from: highAccumulator, to: highLine, opens: 30 ms }
  mainRelief: { is: relief, from: highLine, to: lowLine, cracking: 330 bar(g), fullFlow: 345 bar(g) at 200 L/min }
  pumpMotor: { is: machine, high: highLine, low: lowLine.oil, shaft: { to: propShaft, ratio: 1.4 }, displacement: 110 cm3 }
instruments:
  highPressureSensor: { is: sensor, of: highLine.pressure, range: 0 .. 400 bar(g), lag: 2 ms }
  valveStage: { is: stage, request: requests.valve, drives: isolation.opening }
links:
  powertrain: { is: udp, local: 127.0.0.1:47110, remote: 127.0.0.1:47111 }
messages:
  sensors:
    direction: sent
    id: 1
    every: 10 ms
    phase: 2 ms
    signals:
      highPressure: { from: highPressureSensor.value, unit: bar(g), range: 0 .. 400, type: u16, scale: 0.01 }
      shaftSpeed: { from: propShaft.speed, unit: rpm, range: -4000 .. 4000 rpm }
  requests:
    direction: received
    id: 2
    every: 10 ms
    timeout: 50 ms
    signals:
      torque: { to: pumpMotor.torqueRequest, unit: N m, range: -600 .. 600, substitute: 0 }
      valve: { unit: '%', range: 0 .. 100, substitute: 0 %, type: u8 }
      mode: { names: { off: 0, drive: 1 }, substitute: off }
watch:
  lowLine.pressure: { below: 3 bar(a), level: below least inlet, meaning: the machine cavitates }
life:
  key: off
  bootWindow: 500 ms
  preRoll: 200 ms
  afterRun: 300 ms
  frames: { preRoll: silence, afterRun: plant }
  reset:
    before: [{ at: 0 s, set: life.supply, to: off }, { at: 50 ms, set: life.supply, to: on }]
    after: [{ at: 100 ms, set: life.supply, to: off }]
controller: { command: node controller.js, period: 10 ms }
record: { signals: ['high*', '*.speed'] }
duty: round.yaml
`;
