import { afterEach, describe, expect, it } from 'vitest';
import { UdpError, type UdpOptions, UdpSocket } from '../../bridge/udp-socket.js';
import { whyNotLive } from '../../runtime/realtime/ffi.js';

const here = whyNotLive();
if (here !== '') console.log(`not run: UDP sockets by FFI: ${here}`);

describe.skipIf(here !== '')('UDP socket', () => {
  const open: UdpSocket[] = [];
  const socket = (options: Partial<UdpOptions> = {}) => {
    const made = new UdpSocket({ local: { address: '127.0.0.1', port: 0 }, ...options });
    open.push(made);
    return made;
  };
  const to = (other: UdpSocket) => ({ address: '127.0.0.1', port: other.localPort });
  afterEach(() => {
    for (const one of open.splice(0)) one.close();
  });
  const bytes = (...values: number[]) => Uint8Array.from(values);

  it('carries datagrams of every length whole and in order', () => {
    const receiver = socket();
    const sender = socket({ peer: to(receiver) });
    const into = new Uint8Array(70_000);
    for (const length of [0, 1, 2, 1472, 1473, 9000, 65_507]) {
      const sent = Uint8Array.from({ length }, (_, i) => (i * 31 + length) & 255);
      expect(sender.send(sent, length)).toBe(length);
      expect(receiver.wait(1000)).toBe(true);
      expect(receiver.poll(into)).toBe(length);
      expect(into.subarray(0, length)).toEqual(sent);
    }
    expect(receiver.poll(into)).toBe(-1);
    expect([sender.sent, receiver.received]).toEqual([7, 7]);
  });

  it('sends the first bytes of a view that begins in the middle of its memory', () => {
    const receiver = socket();
    const sender = socket({ peer: to(receiver) });
    sender.send(bytes(1, 2, 3, 4, 5, 6).subarray(2), 3);
    const into = new Uint8Array(16).subarray(8);
    receiver.wait(1000);
    expect(receiver.poll(into)).toBe(3);
    expect([...into.subarray(0, 3)]).toEqual([3, 4, 5]);
  });

  /** A socket that takes the datagrams of one peer only, and that peer. */
  const pair = () => {
    const strict = socket({ local: { address: '0.0.0.0', port: 0 } });
    const peer = socket({ peer: to(strict) });
    peer.send(bytes(0), 1);
    strict.wait(1000);
    strict.poll(new Uint8Array(8));
    strict.adoptSender();
    return { strict, peer };
  };

  it('drops and counts strangers, by port as well as by address', () => {
    const { strict, peer } = pair();
    const otherPort = socket({ peer: to(strict) });
    const otherAddress = socket({ local: { address: '127.0.0.2', port: peer.localPort }, peer: to(strict) });
    otherPort.send(bytes(66), 1);
    otherAddress.send(bytes(67), 1);
    peer.send(bytes(42), 1);
    const into = new Uint8Array(8);
    expect(strict.poll(into)).toBe(1);
    expect(into[0]).toBe(42);
    expect([strict.strangers, strict.received]).toEqual([2, 2]);
  });

  it('does not let a flood of strangers hold one call, nor lose the peer behind it', () => {
    const { strict, peer } = pair();
    const stranger = socket({ peer: to(strict) });
    for (let i = 0; i < 150; i += 1) stranger.send(bytes(1), 1);
    peer.send(bytes(42), 1);
    const into = new Uint8Array(8);
    const strangers: number[] = [];
    let length = -1;
    while (length < 0 && strangers.length < 10) {
      length = strict.poll(into);
      strangers.push(strict.strangers);
    }
    expect(strangers).toEqual([64, 128, 150]);
    expect(into[0]).toBe(42);
  });

  it('cuts a datagram that is longer than the buffer and counts it', () => {
    const receiver = socket();
    const sender = socket({ peer: to(receiver) });
    sender.send(new Uint8Array(100).fill(7), 100);
    receiver.wait(1000);
    const into = new Uint8Array(10);
    expect(receiver.poll(into)).toBe(10);
    expect(receiver.oversized).toBe(1);
    expect(into.every((byte) => byte === 7)).toBe(true);
  });

  it('takes anybody without a peer, and only the adopted one afterwards', () => {
    const receiver = socket();
    const first = socket({ peer: to(receiver) });
    const second = socket({ peer: to(receiver) });
    expect(receiver.send(bytes(1), 1)).toBe(-1);
    expect(receiver.unsentReasonName).toBe('EDESTADDRREQ');
    first.send(bytes(1), 1);
    const into = new Uint8Array(8);
    receiver.wait(1000);
    receiver.poll(into);
    expect(receiver.sender).toEqual({ address: '127.0.0.1', port: first.localPort });
    receiver.adoptSender();
    expect(receiver.peer).toEqual({ address: '127.0.0.1', port: first.localPort });
    second.send(bytes(2), 1);
    receiver.wait(1000);
    expect(receiver.poll(into)).toBe(-1);
    expect(receiver.strangers).toBe(1);
    expect(receiver.send(bytes(9), 1)).toBe(1);
    first.wait(1000);
    expect(first.poll(into)).toBe(1);
  });

  it('goes on when nobody listens at the peer', () => {
    const gone = socket();
    const port = gone.localPort;
    gone.close();
    const sender = socket({ peer: { address: '127.0.0.1', port } });
    for (let i = 0; i < 10; i += 1) sender.send(bytes(1), 1);
    expect(sender.poll(new Uint8Array(8))).toBe(-1);
  });

  it('waits no longer than told and says that nothing came', () => {
    const receiver = socket();
    expect(receiver.wait(0)).toBe(false);
    expect(receiver.wait(5)).toBe(false);
  });

  it('counts what the kernel dropped for want of room', () => {
    const receiver = socket({ receiveBuffer: 4096 });
    const sender = socket({ peer: to(receiver) });
    for (let i = 0; i < 200; i += 1) sender.send(new Uint8Array(1000), 1000);
    const into = new Uint8Array(2000);
    while (receiver.poll(into) >= 0);
    expect(receiver.dropped).toBe(200 - receiver.received);
    expect(receiver.dropped).toBeGreaterThan(0);
    expect(receiver.receiveBuffer).toBeGreaterThanOrEqual(4096);
  });

  it('counts what could not be sent, with its reason', () => {
    const receiver = socket();
    const sender = socket({ peer: to(receiver) });
    expect(sender.send(new Uint8Array(70_000), 70_000)).toBe(-1);
    expect([sender.unsent, sender.unsentReasonName]).toEqual([1, 'EMSGSIZE']);
  });

  it('hears a multicast group on loopback', () => {
    const group = '239.255.77.1';
    const multicast = { group, interfaceAddress: '127.0.0.1' };
    const listener = socket({ local: { address: group, port: 0 }, reuseAddress: true, multicast });
    const second = socket({ local: { address: group, port: listener.localPort }, reuseAddress: true, multicast });
    const speaker = socket({ peer: { address: group, port: listener.localPort }, multicast });
    speaker.send(bytes(5, 6), 2);
    const into = new Uint8Array(8);
    for (const one of [listener, second]) {
      expect(one.wait(1000)).toBe(true);
      expect(one.poll(into)).toBe(2);
      expect(into[1]).toBe(6);
    }
  });

  it('says what is wrong with an address or port, and what to do', () => {
    const taken = socket();
    expect(() => socket({ local: to(taken) })).toThrow(
      /binding UDP 127\.0\.0\.1:\d+ failed: EADDRINUSE; another program holds this port/,
    );
    expect(() => socket({ local: { address: '192.0.2.1', port: 0 } })).toThrow(
      /EADDRNOTAVAIL; no interface of this computer/,
    );
    expect(() => socket({ local: { address: 'localhost', port: 0 } })).toThrow(/"localhost": an IPv4 address such as/);
    expect(() => socket({ local: { address: '127.0.0.256', port: 0 } })).toThrow(/IPv4/);
    expect(() => socket({ peer: { address: '127.0.0.1', port: 65_536 } })).toThrow(/port 65536: a whole number/);
    try {
      socket({ local: to(taken) });
      expect.unreachable();
    } catch (error) {
      expect(error).toBeInstanceOf(UdpError);
      expect((error as UdpError).code).toBe('EADDRINUSE');
    }
  });

  it('throws when used after closing, and closes twice without harm', () => {
    const one = socket({ peer: { address: '127.0.0.1', port: 9 } });
    one.close();
    one.close();
    expect(() => one.poll(new Uint8Array(8))).toThrow(/receiving failed: EBADF/);
    expect(() => one.send(bytes(1), 1)).toThrow(/sending failed: EBADF/);
  });
});
