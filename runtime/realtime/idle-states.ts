import fs from 'node:fs';

export interface IdleHold {
  readonly held: boolean;
  readonly words: string;
  release(): void;
}

/**
 * Asks the kernel to keep the processors out of idle states that take time to leave, for as long as the file stays open
 * (Linux PM quality of service, Documentation/power/pm_qos_interface). It ends with the process at the latest.
 */
export function holdIdleStates(): IdleHold {
  try {
    const file = fs.openSync('/dev/cpu_dma_latency', 'r+');
    fs.writeSync(file, new Uint8Array(4));
    let open = true;
    return {
      held: true,
      words: 'deep idle states of the processors held off',
      release() {
        if (open) fs.closeSync(file);
        open = false;
      },
    };
  } catch (error) {
    const code = (error as NodeJS.ErrnoException).code;
    return {
      held: false,
      words: `deep idle states of the processors not held off: /dev/cpu_dma_latency ${code}${code === 'EACCES' ? '; a udev rule can give the group of the bench write access' : ''}`,
      release() {},
    };
  }
}
