import { lockMemory } from '../../../runtime/realtime/memory-lock.js';
import { enterScheduling } from '../../../runtime/realtime/scheduling.js';

// As an ordinary user, where the test itself runs as root.
if (process.getuid?.() === 0) process.setuid?.(65534);
const scheduling = enterScheduling();
scheduling.restore();
const memory = lockMemory([new Float64Array(new SharedArrayBuffer(4096))]);
memory.release();
console.log(JSON.stringify({ policy: scheduling.policy, words: scheduling.words, memory: memory.words }));
