import fs from 'node:fs';
import os from 'node:os';

/** Facts about this computer that bear on timing, for the header of a recording. Plain names and values, no addresses. */
export function machineFacts(): Record<string, string | number | boolean> {
  const processors = os.cpus();
  const facts: Record<string, string | number | boolean> = {
    system: `${os.type()} ${os.release()} ${os.machine()}`,
    processor: processors[0]?.model.trim() ?? 'unknown',
    processors: processors.length,
    memory: os.totalmem(),
  };
  if (process.platform !== 'linux') return facts;
  const add = (name: string, path: string, pick: (text: string) => string | undefined = (text) => text) => {
    const value = pick(readText(path).trim());
    if (value !== undefined && value !== '') facts[name] = value;
  };
  add(
    'preemption',
    '/proc/version',
    (text) => /PREEMPT_RT|PREEMPT_DYNAMIC|PREEMPT/.exec(text)?.[0] ?? (text === '' ? undefined : 'none'),
  );
  add('clockSource', '/sys/devices/system/clocksource/clocksource0/current_clocksource');
  add('isolated', '/sys/devices/system/cpu/isolated');
  add('governor', '/sys/devices/system/cpu/cpu0/cpufreq/scaling_governor');
  add('idleDriver', '/sys/devices/system/cpu/cpuidle/current_driver');
  add('siblingThreads', '/sys/devices/system/cpu/smt/active', (text) =>
    text === '' ? undefined : text === '1' ? 'on' : 'off',
  );
  add('realtimeThrottle', '/proc/sys/kernel/sched_rt_runtime_us');
  facts['loadAtStart'] = os.loadavg()[0]!;
  return facts;
}

function readText(path: string): string {
  try {
    return fs.readFileSync(path, 'utf8');
  } catch {
    return '';
  }
}
