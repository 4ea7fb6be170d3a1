import { createHash, randomBytes, timingSafeEqual } from 'node:crypto';
import type { IncomingMessage } from 'node:http';
import { isIP } from 'node:net';

/**
 * Who may speak to the server. A web page that a user has open elsewhere can send requests to any address that the
 * browser reaches: Origin (RFC 6454) tells it apart, and Host stops a name that was rebound to this address.
 */
export interface GuardOptions {
  /** Names besides the address itself by which the server may be called, for addresses other than loopback. */
  readonly names: readonly string[];
  /** Port that the server listens on. */
  readonly port: number;
}

/** Why a request is refused. */
export interface Refused {
  readonly status: 400 | 401 | 403 | 404 | 405 | 413 | 421 | 429;
  readonly what: string;
}

export function isLoopback(address: string): boolean {
  const plain = plainAddress(address);
  return plain === '::1' || plain === 'localhost' || (isIP(plain) === 4 && plain.startsWith('127.'));
}

/** Checks Host, Origin and Sec-Fetch-Site; undefined when they are as they must be. */
export function refuses(request: IncomingMessage, options: GuardOptions, upgrade: boolean): Refused | undefined {
  const hostText = request.headers.host;
  const host = hostText === undefined ? undefined : splitHost(hostText);
  if (host === undefined) return { status: 400, what: 'the request names no host' };
  const local = plainAddress(request.socket.localAddress ?? '');
  const known =
    host.port === options.port &&
    (host.name === local ||
      (isLoopback(local) && (host.name === 'localhost' || isLoopback(host.name))) ||
      options.names.includes(host.name));
  if (!known) {
    return {
      status: 421,
      what: `this server is not called ${JSON.stringify(hostText?.slice(0, 80))}; name it with --live-name if it should be`,
    };
  }
  const origin = request.headers.origin;
  if (origin !== undefined || upgrade) {
    if (origin !== `http://${hostText}`) return { status: 403, what: 'only pages of this server may speak to it' };
  }
  const site = request.headers['sec-fetch-site'];
  if (site !== undefined && site !== 'same-origin' && site !== 'none' && !upgrade) {
    // following a link to the page is fine: it shows nothing to the page with the link
    const navigates =
      request.headers['sec-fetch-mode'] === 'navigate' &&
      request.headers['sec-fetch-dest'] === 'document' &&
      request.method === 'GET';
    if (!navigates) return { status: 403, what: 'only pages of this server may ask for this' };
  }
  return undefined;
}

function splitHost(text: string): { name: string; port: number } | undefined {
  const match = /^(?:\[([0-9a-f:.]+)\]|([a-z0-9.-]+))(?::(\d{1,5}))?$/i.exec(text);
  if (match === null) return undefined;
  return {
    name: plainAddress((match[1] ?? match[2]).toLowerCase()),
    port: match[3] === undefined ? 80 : Number(match[3]),
  };
}

/** Without brackets and without the prefix of an IPv4 address in IPv6 clothing. */
function plainAddress(address: string): string {
  return address.replace(/^\[|\]$/g, '').replace(/^::ffff:(?=\d+\.)/i, '');
}

/** Headers of every answer. */
export function securityHeaders(hostText: string | undefined): Record<string, string> {
  const host = hostText !== undefined && splitHost(hostText) !== undefined ? ` ws://${hostText}` : '';
  return {
    'Content-Security-Policy': [
      "default-src 'none'",
      "script-src 'self'",
      "style-src 'self'",
      "img-src 'self' data:",
      `connect-src 'self'${host}`,
      "worker-src 'self'",
      "manifest-src 'self'",
      "base-uri 'none'",
      "form-action 'self'",
      "frame-ancestors 'none'",
    ].join('; '),
    'X-Content-Type-Options': 'nosniff',
    'X-Frame-Options': 'DENY',
    'Referrer-Policy': 'no-referrer',
    'Cross-Origin-Opener-Policy': 'same-origin',
    'Cross-Origin-Resource-Policy': 'same-origin',
    'Permissions-Policy': 'camera=(), microphone=(), geolocation=()',
  };
}

/** A token to print and to type: 120 bits, base64url. */
export function newToken(): string {
  return randomBytes(15).toString('base64url');
}

/** Compares tokens in constant time and slows down who guesses: a few wrong ones per address and minute, then none. */
export class TokenGate {
  private readonly digest: Buffer;
  /** Value of the cookie that stands for the token; not the token, so that a cookie jar does not leak it. */
  readonly cookie: string;
  private readonly wrongs = new Map<string, { count: number; since: number }>();
  private wrongEverywhere = { count: 0, since: 0 };

  constructor(
    token: string,
    private readonly now: () => number,
    private readonly perAddress = 5,
    private readonly everywhere = 60,
  ) {
    this.digest = digestOf(token);
    this.cookie = randomBytes(24).toString('base64url');
  }

  /** `wait`: too many wrong ones from there within a minute; the token is then not even looked at. */
  try(token: string, address: string): 'right' | 'wrong' | 'wait' {
    const now = this.now();
    if (now - this.wrongEverywhere.since > 60_000) this.wrongEverywhere = { count: 0, since: now };
    let own = this.wrongs.get(address);
    if (own === undefined || now - own.since > 60_000) own = { count: 0, since: now };
    if (own.count >= this.perAddress || this.wrongEverywhere.count >= this.everywhere) return 'wait';
    if (timingSafeEqual(digestOf(token), this.digest)) {
      this.wrongs.delete(address);
      return 'right';
    }
    own.count += 1;
    this.wrongEverywhere.count += 1;
    if (this.wrongs.size > 1000) this.wrongs.clear();
    this.wrongs.set(address, own);
    return 'wrong';
  }

  holdsCookie(request: IncomingMessage): boolean {
    for (const part of (request.headers.cookie ?? '').split(';')) {
      const at = part.indexOf('=');
      if (
        at > 0 &&
        part.slice(0, at).trim() === cookieName &&
        timingSafeEqual(digestOf(part.slice(at + 1).trim()), digestOf(this.cookie))
      ) {
        return true;
      }
    }
    return false;
  }
}
export const cookieName = 'oilspringToken';

function digestOf(text: string): Buffer {
  return createHash('sha256').update(text).digest();
}

/** Tokens of a bucket that fills at `rate` per second up to `size`; for limits on messages. */
export class Allowance {
  private left: number;
  private at: number;
  constructor(
    private readonly size: number,
    private readonly rate: number,
    private readonly now: () => number,
  ) {
    this.left = size;
    this.at = now();
  }
  take(): boolean {
    const now = this.now();
    this.left = Math.min(this.size, this.left + ((now - this.at) / 1000) * this.rate);
    this.at = now;
    if (this.left < 1) return false;
    this.left -= 1;
    return true;
  }
}
