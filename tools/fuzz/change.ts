import type { Choose } from '../determinism/draw.js';

const numbers = [
  '0',
  '-1',
  '1',
  '1e9',
  '1e400',
  '-0',
  '0.1',
  'NaN',
  '255',
  '256',
  '65535',
  '4294967296',
  '-2147483649',
  '64',
  '8',
];
const bytes = [0, 1, 7, 8, 0x0f, 0x7f, 0x80, 0x8b, 0xc0, 0xc1, 0xc4, 0xcb, 0xcc, 0xd9, 0xdf, 0xff];

/** Changes an input in one to six places, with other inputs and the words of its language at hand. */
export function changed(
  input: Uint8Array,
  choose: Choose,
  pool: readonly Uint8Array[],
  words: readonly string[],
  longest: number,
): Uint8Array {
  let now = Buffer.from(input);
  const cut = (from: number, count: number, put: Uint8Array) =>
    Buffer.concat([now.subarray(0, from), put, now.subarray(Math.min(now.length, from + count))]);
  for (let times = 1 + choose(choose(2) === 0 ? 2 : 6); times > 0; times -= 1) {
    const at = now.length === 0 ? 0 : choose(now.length);
    switch (choose(words.length > 0 ? 12 : 8)) {
      case 0:
        if (now.length > 0) now[at] = now[at]! ^ (1 << choose(8));
        break;
      case 1:
        if (now.length > 0) now[at] = choose(2) === 0 ? choose(256) : bytes[choose(bytes.length)]!;
        break;
      case 2:
        now = cut(at, 1 + choose(choose(4) === 0 ? 60 : 4), Buffer.alloc(0));
        break;
      case 3:
        now = cut(at, 0, Buffer.from(now.subarray(at, at + 1 + choose(choose(4) === 0 ? 60 : 6))));
        break;
      case 4:
        now = cut(at, 0, Buffer.from(Array.from({ length: 1 + choose(4) }, () => choose(256))));
        break;
      case 5: {
        const other = pool[choose(pool.length)]!;
        if (other.length === 0) break;
        const from = choose(other.length);
        now = cut(at, choose(30), other.subarray(from, from + 1 + choose(60)));
        break;
      }
      case 6: {
        // a number of 16 or 32 bits a little up or down
        if (now.length < 4) break;
        const place = choose(now.length - 3);
        if (choose(2) === 0) now.writeUInt16LE((now.readUInt16LE(place) + choose(33) + 65_520) & 0xffff, place);
        else now.writeUInt32LE((now.readUInt32LE(place) + choose(33) - 16) >>> 0, place);
        break;
      }
      case 7: {
        const other = pool[choose(pool.length)]!;
        const shared = Math.min(now.length, other.length);
        if (shared > 0) {
          const point = choose(shared);
          now = Buffer.concat([now.subarray(0, point), other.subarray(point)]);
        }
        break;
      }
      case 8:
        now = cut(at, 0, Buffer.from(words[choose(words.length)]!));
        break;
      case 9: {
        // a word for a word, a number for a number
        const text = now.toString('latin1');
        const places = [...text.matchAll(choose(2) === 0 ? /-?\d+(?:\.\d+)?/g : /[A-Za-z_]\w*/g)];
        if (places.length === 0) break;
        const place = places[choose(places.length)]!;
        const put = /^[A-Za-z_]/.test(place[0]) ? words[choose(words.length)]! : numbers[choose(numbers.length)]!;
        now = cut(place.index, place[0].length, Buffer.from(put, 'latin1'));
        break;
      }
      case 10: {
        // a line twice, or gone, or in another place
        const lines = now.toString('latin1').split('\n');
        const line = choose(lines.length);
        const kept = choose(3) > 0 ? lines[line]! : undefined;
        if (choose(2) === 0) lines.splice(line, 1);
        if (kept !== undefined) lines.splice(choose(lines.length + 1), 0, kept);
        now = Buffer.from(lines.join('\n'), 'latin1');
        break;
      }
      default:
        now = cut(at, 0, Buffer.from(numbers[choose(numbers.length)]!));
    }
  }
  return now.length > longest ? now.subarray(0, longest) : now;
}
