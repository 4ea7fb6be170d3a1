/** One mistake planted into a copy of a controller: each text must stand in the source exactly once. */
export interface PlantedBug {
  name: string;
  /** What the author of the copy got wrong, as a reviewer would write it. */
  mistake: string;
  edits: readonly { from: string; to: string }[];
}

/**
 * Mistakes in copies of the harbour truck's demo controller. They were written from the controller's source alone,
 * before its author had read any scenario or requirement of the suite, so that the share caught says something.
 */
export const plantedBugs: readonly PlantedBug[] = [
  // units, signs, scales
  bug('speed-in-kilometres', 'the speed is used in km/h where m/s is meant', [
    'read[input.speed]! / 3.6',
    'read[input.speed]!',
  ]),
  bug('turns-taken-twice', 'turns per minute become radians per second with 60 where 30 belongs', [
    '(turnsPerMinute * Math.PI) / 30',
    '(turnsPerMinute * Math.PI) / 60',
  ]),
  bug('bar-to-wrong-pascal', 'the reach of the pump-motor is reckoned with 1 bar = 1e6 Pa', ['* 1e5;', '* 1e6;']),
  bug('turn-instead-of-radian', 'the displacement per turn is taken as displacement per radian', [
    '/ (2 * Math.PI)) *\n',
    '/ 1) *\n',
  ]),
  bug('brake-torque-with-wrong-sign', 'the recovered torque is added to the service brakes', [
    'retard + Math.min(hydraulicShare, 0)',
    'retard - Math.min(hydraulicShare, 0)',
  ]),
  bug('charge-pump-upside-down', 'the charge pump slows down when the low pressure falls', [
    'pressures.lowLeast + 0.8 - read[input.lowPressure]!',
    'read[input.lowPressure]! - pressures.lowLeast - 0.8',
  ]),
  bug('wrong-period', 'the controller believes that it steps every millisecond', [
    'const period = 0.005;',
    'const period = 0.001;',
  ]),
  // blending
  bug('brakes-forget-the-pump', 'the service brakes do all the braking, beside the pump-motor', [
    'Math.max(0, retard + Math.min(hydraulicShare, 0))',
    'Math.max(0, retard)',
  ]),
  bug('brakes-trust-the-wish', 'the service brakes give way for what the pump-motor was asked in this step', [
    'retard + Math.min(hydraulicShare, 0)',
    'retard + Math.min(pumpWanted * truck.pumpRatio, 0)',
  ]),
  bug('rear-brake-takes-the-front', 'the rear brake gets the share of the front one', [
    'friction * (1 - truck.frontShare)',
    'friction * (1 + truck.frontShare)',
  ]),
  bug('front-brake-alone', 'the rear brake is never applied', [
    'write[output.rearBrake] = limit((friction * (1 - truck.frontShare)) / truck.rearBrake, 0, 1);',
    'write[output.rearBrake] = 0;',
  ]),
  bug('recovery-to-standstill', 'recovery does not fade out at walking speed', [
    '* nearFull * ramp(speed, 0.8, 2.2)',
    '* nearFull',
  ]),
  bug('accelerator-beats-brake', 'the engine drives on while the driver brakes', [
    'const missing = retard > 0 ? 0 : Math.max(0, drive - hydraulicShare);',
    'const missing = Math.max(0, drive - Math.max(0, hydraulicShare));',
    'running && forward && retard === 0 && missing > 0',
    'running && forward && missing > 0',
  ]),
  // near full and near empty
  bug('recovery-when-full', 'recovery does not give way to a full accumulator', [
    'reach) * nearFull * ramp',
    'reach) * ramp',
  ]),
  bug('near-full-reversed', 'the fade near full runs the wrong way', [
    'ramp(accumulator, pressures.full, pressures.nearFull)',
    'ramp(accumulator, pressures.nearFull, pressures.full)',
  ]),
  bug('drives-until-empty', 'neither the threshold nor the fade near empty is kept', [
    'reach) * nearEmpty;',
    'reach);',
    'empty: 165,',
    'empty: 20,',
  ]),
  bug('no-gap-between-sources', 'empty and filled are the same pressure', ['filled: 205,', 'filled: 166,']),
  bug('recharges-without-end', 'recharging by the engine does not stop at enough', [
    ' * ramp(accumulator, pressures.enough, pressures.nearEnough);',
    ';',
  ]),
  bug('recharges-at-full-throttle', 'recharging takes torque that the driver wants', [
    'ramp(accelerator, 0.75, 0.55)',
    'ramp(accelerator, 0.55, 0.75)',
  ]),
  // connecting
  bug('connects-at-any-speed', 'the pump-motor is connected without waiting for matched speed', [
    'Math.abs(pumpSpeed - matched) < 6',
    'Math.abs(pumpSpeed - matched) < 600',
  ]),
  bug('never-lets-go', 'the pump-motor stays connected above its speed', [
    'if (!open || Math.abs(matched) > speeds.pumpMost) now.connected = 0;',
    'if (!open) now.connected = 0;',
    ' *\n      ramp(Math.abs(matched), speeds.pumpMost, speeds.pumpHigh);',
    ';',
  ]),
  bug('torque-in-steps', 'the request to the pump-motor is not limited in its rate', ['gentle * period', 'gentle']),
  bug('slow-recovery', 'the request to the pump-motor follows the brake pedal in seconds', [
    'source.accumulator ? 4000 : 300',
    'source.accumulator ? 60 : 60',
  ]),
  // silence, key, restart
  bug('old-pressures-believed', 'pressures that no longer arrive are used for ever', [
    'const hydraulics = key && read[input.hydraulicAge]! < 50;',
    'const hydraulics = key;',
  ]),
  bug('old-pedals-believed', 'pedals that no longer arrive are used for ever', [
    'read[input.vehicleAge]! < 100 && read[input.drivelineAge]! < 100',
    'read[input.drivelineAge]! < 100',
  ]),
  bug('no-brake-when-silent', 'the truck is not braked when the pedals fall silent', ['! : 0.35;', '! : 0;']),
  bug('open-without-key', 'the hydraulics stay open when the key is turned off', [
    'const hydraulics = key && ',
    'const hydraulics = awake && ',
  ]),
  bug('engine-without-key', 'the engine runs on when the key is turned off', [
    'if (!key || now.engineIdleFor > 1.5)',
    'if (now.engineIdleFor > 1.5)',
  ]),
  bug('memory-kept-over-restart', 'a restart leaves gear, phase and requests as they were', [
    'void Object.assign(now, start)',
    'undefined',
  ]),
  bug('valve-always-open', 'the isolation valve is opened at start and never closed', [
    'write[output.isolation] = open ? 1 : 0;',
    'write[output.isolation] = 1;',
  ]),
  bug('pump-always-enabled', 'the pump-motor is enabled before the valve is open and after it is closed', [
    'write[output.enable] = open ? 1 : 0;',
    'write[output.enable] = 1;',
  ]),
  // engine, clutch, gears
  bug('engine-never-off', 'the engine idles while the accumulator drives', ['|| now.engineIdleFor > 1.5)', ')']),
  bug('engine-comes-late', 'the engine is started 3 s after it is wanted', [
    'now.engineWantedFor > 0.15',
    'now.engineWantedFor > 3',
  ]),
  bug('starter-holds-on', 'the starter turns as long as the ignition is on', [
    '320 * ramp(engineSpeed, speeds.firing, speeds.firing - 10)',
    '320',
  ]),
  bug('clutch-snaps-shut', 'the clutch closes at once at a launch', [
    'limit(wish / truck.clutchTorque, 0.05, 0.5) * ramp(engineSpeed, speeds.running, speeds.launch - 10)',
    '1',
  ]),
  bug('gear-under-load', 'the gear is changed before the clutch is open', [
    'now.phase === phase.unloading && now.clutch < 0.02',
    'now.phase === phase.unloading && now.clutch < 2',
  ]),
  bug('wrong-ratio', 'the table of ratios is read one gear too high', [
    'const ratio = truck.gears[now.gear - 1]!;',
    'const ratio = truck.gears[Math.min(now.gear, 5)]!;',
  ]),
  bug('hunting-gears', 'the speeds for changing down and up lie too close together', ['down: 88,', 'down: 150,']),
  bug('power-not-limited', 'full accelerator asks for the same force at any speed', [
    'Math.min(truck.acceleratorForce, truck.power / Math.max(Math.abs(speed), 2))',
    'truck.acceleratorForce',
  ]),
  bug('neutral-while-rolling', 'the gearbox is put in neutral as soon as the selector leaves forward', [
    'key && (forward || Math.abs(speed) > 0.5)',
    'key && forward',
  ]),
];

function bug(name: string, mistake: string, texts: readonly string[]): PlantedBug {
  const edits: { from: string; to: string }[] = [];
  for (let k = 0; k + 1 < texts.length; k += 2) edits.push({ from: texts[k]!, to: texts[k + 1]! });
  return { name, mistake, edits };
}
