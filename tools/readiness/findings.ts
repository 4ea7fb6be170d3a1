import fs from 'node:fs';
import os from 'node:os';
import path from 'node:path';
import { whyNotLive } from '../../runtime/realtime/ffi.js';
import { type SchedulingRights, schedulingRights } from '../../runtime/realtime/scheduling.js';

/** One property of this computer that bears on live runs. */
export interface Finding {
  readonly name: string;
  readonly found: string;
  /** `good`: leave it. `could be better`: live runs work, less punctual. `bad`: live runs suffer or fail. */
  readonly verdict: 'good' | 'could be better' | 'bad' | 'unknown';
  /** What it means for a live run. */
  readonly meaning: string;
  /** Commands (Debian) or steps that change it; empty when there is nothing to do. */
  readonly remedy: readonly string[];
}

/** What the findings are read from; tests bring their own. */
export interface Machine {
  read(file: string): string;
  list(folder: string): readonly string[];
  readonly rights: SchedulingRights;
  readonly processors: number;
  /** '' when live runs are possible at all. */
  readonly notLive: string;
}

export function thisMachine(): Machine {
  const notLive = whyNotLive();
  return {
    read: (file) => {
      try {
        return fs.readFileSync(file, 'utf8').trim();
      } catch {
        return '';
      }
    },
    list: (folder) => {
      try {
        return fs.readdirSync(folder).sort();
      } catch {
        return [];
      }
    },
    rights: schedulingRights(),
    processors: os.cpus().length,
    notLive,
  };
}

const CPU = '/sys/devices/system/cpu';

export function findings(machine: Machine): Finding[] {
  return [
    livePossible(machine),
    preemption(machine),
    rights(machine),
    memoryLock(machine),
    isolated(machine),
    governor(machine),
    idleStates(machine),
    siblings(machine),
    timerSlack(machine),
    throttle(machine),
    clockSource(machine),
    virtual(machine),
    swap(machine),
    can(machine),
  ];
}

function livePossible({ notLive }: Machine): Finding {
  return notLive === ''
    ? {
        name: 'live runs',
        found: 'possible: Linux, calls into the C library work',
        verdict: 'good',
        meaning: 'the loop waits and talks by system calls of its own',
        remedy: [],
      }
    : {
        name: 'live runs',
        found: notLive,
        verdict: 'bad',
        meaning: 'only --pace fast, rederive, check and report work here',
        remedy: ['npm ci'],
      };
}

function preemption(machine: Machine): Finding {
  const name = 'kernel preemption';
  const text = machine.read('/proc/version');
  const realtime = machine.read('/sys/kernel/realtime') === '1' || /PREEMPT_RT/.test(text);
  if (realtime)
    return {
      name,
      found: 'PREEMPT_RT',
      verdict: 'good',
      meaning: 'the kernel can be interrupted almost everywhere: the bound on lateness is the best there is',
      remedy: [],
    };
  const model = /PREEMPT_DYNAMIC|PREEMPT/.exec(text)?.[0] ?? (text === '' ? '' : 'none or voluntary');
  const chosen = /preempt=(\w+)/.exec(machine.read('/proc/cmdline'))?.[1];
  return {
    name,
    found: model === '' ? 'unknown' : `${model}${chosen === undefined ? '' : ` (preempt=${chosen})`}`,
    verdict: model === '' ? 'unknown' : 'could be better',
    meaning:
      'mostly punctual, with rare lateness of some hundred µs to some ms while the kernel is busy with other things',
    remedy: [
      'sudo apt install linux-image-rt-amd64   # a real-time kernel, then restart',
      'without it: add preempt=full to GRUB_CMDLINE_LINUX in /etc/default/grub, sudo update-grub, restart',
    ],
  };
}

function rights({ rights: { niceCapability, priorityLimit } }: Machine): Finding {
  const name = 'right to real-time scheduling';
  const found = `CAP_SYS_NICE ${niceCapability ? 'yes' : 'no'}, rtprio limit ${priorityLimit}`;
  if (niceCapability || priorityLimit > 0)
    return {
      name,
      found,
      verdict: 'good',
      meaning: 'the loop thread, and it alone, runs under SCHED_FIFO',
      remedy: [],
    };
  return {
    name,
    found,
    verdict: 'bad',
    meaning:
      'the loop competes with every other program: under load its lateness is an order of magnitude larger. Root is not needed',
    remedy: [
      'oilspring readiness --unit > oilspring.service   # a systemd unit with these rights and no more',
      `or for your user: printf '%s - rtprio 80\\n%s - memlock 268435456\\n' "$USER" "$USER" | sudo tee /etc/security/limits.d/90-oilspring.conf, then log in anew`,
    ],
  };
}

function memoryLock({ rights: { lockCapability, lockLimit } }: Machine): Finding {
  const enough = lockCapability || lockLimit >= 128 * 2 ** 20;
  return {
    name: 'memory-lock limit',
    found: lockCapability
      ? 'CAP_IPC_LOCK yes'
      : lockLimit === Number.POSITIVE_INFINITY
        ? 'no limit'
        : `${(lockLimit / 2 ** 20).toFixed(0)} MiB`,
    verdict: enough ? 'good' : 'could be better',
    meaning: enough
      ? "the program's text and the loop's numbers are held in memory"
      : 'on a computer short of memory a tick may wait for the disk: about 150 MiB want to be held',
    remedy: enough
      ? []
      : [
          `echo "$USER - memlock 268435456" | sudo tee -a /etc/security/limits.d/90-oilspring.conf   # then log in anew`,
        ],
  };
}

function isolated(machine: Machine): Finding {
  const name = 'isolated processors';
  const list = machine.read(`${CPU}/isolated`);
  if (list !== '')
    return {
      name,
      found: list,
      verdict: 'good',
      meaning: `nothing else runs there: give the loop one with --core ${list.split(/[-,]/)[0]}`,
      remedy: [],
    };
  const last = machine.processors - 1;
  return {
    name,
    found: 'none',
    verdict: machine.processors > 2 ? 'could be better' : 'unknown',
    meaning:
      machine.processors > 2
        ? 'other programs and interrupts share the processor of the loop'
        : `with ${machine.processors} processors there is none to spare`,
    remedy:
      machine.processors > 2
        ? [
            `add isolcpus=${last} nohz_full=${last} rcu_nocbs=${last} to GRUB_CMDLINE_LINUX in /etc/default/grub, sudo update-grub, restart; then run with --core ${last}`,
          ]
        : [],
  };
}

function governor(machine: Machine): Finding {
  const name = 'frequency governor';
  const all = new Set(
    machine
      .list(CPU)
      .filter((one) => /^cpu\d+$/.test(one))
      .map((one) => machine.read(`${CPU}/${one}/cpufreq/scaling_governor`)),
  );
  all.delete('');
  const found = [...all].join(', ');
  if (found === '')
    return {
      name,
      found: 'none visible',
      verdict: 'unknown',
      meaning: 'the hardware or the host of a virtual machine decides',
      remedy: [],
    };
  return found === 'performance'
    ? { name, found, verdict: 'good', meaning: 'the clock rate stays up between ticks', remedy: [] }
    : {
        name,
        found,
        verdict: 'could be better',
        meaning: 'the processor slows down between ticks: steps take longer, and not always the same',
        remedy: ['sudo apt install linux-cpupower && sudo cpupower frequency-set --governor performance'],
      };
}

function idleStates(machine: Machine): Finding {
  const name = 'idle states';
  const folder = `${CPU}/cpu0/cpuidle`;
  const states = machine.list(folder).map((one) => ({
    name: machine.read(`${folder}/${one}/name`),
    latency: Number(machine.read(`${folder}/${one}/latency`)),
    off: machine.read(`${folder}/${one}/disable`) === '1',
  }));
  if (states.length === 0)
    return {
      name,
      found: 'none visible',
      verdict: 'unknown',
      meaning: 'the hardware or the host of a virtual machine decides',
      remedy: [],
    };
  const used = states.filter((state) => !state.off);
  const deepest = Math.max(0, ...used.map((state) => state.latency));
  const found = used.map((state) => `${state.name} (${state.latency} µs to leave)`).join(', ');
  return deepest <= 20
    ? { name, found, verdict: 'good', meaning: 'waking up costs little', remedy: [] }
    : {
        name,
        found,
        verdict: 'could be better',
        meaning: `waking up may take ${deepest} µs; a live run holds the deep states off by itself where it may write /dev/cpu_dma_latency`,
        remedy: [
          `echo 'KERNEL=="cpu_dma_latency", GROUP="'$(id -gn)'", MODE="0660"' | sudo tee /etc/udev/rules.d/90-oilspring.rules && sudo udevadm control --reload && sudo udevadm trigger /dev/cpu_dma_latency`,
        ],
      };
}

function siblings(machine: Machine): Finding {
  const name = 'sibling threads';
  const list = machine.read(`${CPU}/cpu0/topology/thread_siblings_list`);
  const active = machine.read(`${CPU}/smt/active`);
  if (active === '' && list === '')
    return {
      name,
      found: 'unknown',
      verdict: 'unknown',
      meaning: 'whether two processors share one core is not told',
      remedy: [],
    };
  const shared = active === '1' || /[-,]/.test(list);
  return shared
    ? {
        name,
        found: `processor 0 shares its core with ${list}`,
        verdict: 'could be better',
        meaning: "what runs on the sibling slows the loop's steps",
        remedy: [
          'echo off | sudo tee /sys/devices/system/cpu/smt/control   # until the next start; or nosmt on the kernel command line',
        ],
      }
    : { name, found: 'none', verdict: 'good', meaning: 'each processor is a core of its own', remedy: [] };
}

function timerSlack(machine: Machine): Finding {
  const slack = machine.read('/proc/self/timerslack_ns');
  return {
    name: 'timer slack',
    found: slack === '' ? 'unknown' : `${slack} ns`,
    verdict: slack === '' ? 'unknown' : 'good',
    meaning:
      'how much later the kernel may wake an ordinary thread; the loop sets its own to 1 ns, and under SCHED_FIFO there is none',
    remedy: [],
  };
}

function throttle(machine: Machine): Finding {
  const text = machine.read('/proc/sys/kernel/sched_rt_runtime_us');
  return {
    name: 'real-time throttle',
    found:
      text === ''
        ? 'unknown'
        : text === '-1'
          ? 'off'
          : `${text} µs of ${machine.read('/proc/sys/kernel/sched_rt_period_us') || '1000000'}`,
    verdict: text === '' ? 'unknown' : 'good',
    meaning:
      'keeps a real-time thread that never sleeps from holding the computer; the loop sleeps in every tick and does not meet it',
    remedy: [],
  };
}

function clockSource(machine: Machine): Finding {
  const name = 'clock source';
  const found = machine.read('/sys/devices/system/clocksource/clocksource0/current_clocksource');
  if (found === '')
    return {
      name,
      found: 'unknown',
      verdict: 'unknown',
      meaning: 'how long reading the clock takes is not told',
      remedy: [],
    };
  const quick = ['tsc', 'arch_sys_counter', 'kvm-clock', 'hyperv_clocksource_tsc_page', 'riscv_clocksource'].includes(
    found,
  );
  return quick
    ? { name, found, verdict: 'good', meaning: 'reading the clock takes some ten ns', remedy: [] }
    : {
        name,
        found,
        verdict: 'could be better',
        meaning: 'reading the clock is a slow access to a device',
        remedy: [
          'echo tsc | sudo tee /sys/devices/system/clocksource/clocksource0/current_clocksource   # if it is offered',
        ],
      };
}

function virtual(machine: Machine): Finding {
  const guest = /^flags.*\bhypervisor\b/m.test(machine.read('/proc/cpuinfo'));
  return guest
    ? {
        name: 'hardware',
        found: 'a virtual machine',
        verdict: 'could be better',
        meaning: 'its host may take the processor away for milliseconds, and nothing here can prevent it',
        remedy: ['use a computer of its own for runs that count'],
      }
    : {
        name: 'hardware',
        found: 'no virtual machine',
        verdict: 'good',
        meaning: 'nobody but this kernel hands out the processor',
        remedy: [],
      };
}

function swap(machine: Machine): Finding {
  const inUse = machine.read('/proc/swaps').split('\n').length > 1;
  return inUse
    ? {
        name: 'swap',
        found: 'in use',
        verdict: 'could be better',
        meaning: 'pages of the heap may leave memory, and a tick waits for the disk',
        remedy: ['sudo swapoff --all   # until the next start'],
      }
    : { name: 'swap', found: 'none', verdict: 'good', meaning: 'what is in memory stays there', remedy: [] };
}

function can(machine: Machine): Finding {
  // ARPHRD_CAN of linux/if_arp.h
  const names = machine
    .list('/sys/class/net')
    .filter((one) => machine.read(path.posix.join('/sys/class/net', one, 'type')) === '280');
  return names.length > 0
    ? {
        name: 'CAN interfaces',
        found: names
          .map((one) => `${one} (${machine.read(`/sys/class/net/${one}/operstate`) || 'unknown'})`)
          .join(', '),
        verdict: 'good',
        meaning: 'benches with CAN links can run live',
        remedy: [],
      }
    : {
        name: 'CAN interfaces',
        found: 'none',
        verdict: 'unknown',
        meaning: 'only benches with UDP links can run live, which is fine where no CAN is wanted',
        remedy: [
          'sudo ip link set can0 up type can bitrate 500000   # an adapter',
          'sudo modprobe vcan && sudo ip link add vcan0 type vcan && sudo ip link set vcan0 up   # a virtual bus',
        ],
      };
}
