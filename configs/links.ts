import { isIPv4 } from 'node:net';
import { usualGroup } from '../bridge/can-datagram.js';
import { type AddressedUnit, nameLimits, type UnitName } from '../bridge/j1939/name.js';
import type { LinkSpec } from '../bridge/message-map.js';
import { shown } from './quantity.js';
import type { Section } from './section.js';

/** Reads one link: `{ is: udp, local: 127.0.0.1:47110, remote: 127.0.0.1:47111 }` or `{ is: can, interface: can0 }`. */
export function readLink(name: string, section: Section): LinkSpec | undefined {
  const kind = section.choice('is', ['udp', 'can', 'can-multicast'] as const, { required: true });
  section.skip('about');
  if (!kind) return undefined;
  if (kind === 'udp') {
    const local = readAddress(section, 'local', '127.0.0.1:47110');
    const remote = readAddress(section, 'remote', '127.0.0.1:47111');
    section.finish();
    return local && remote
      ? {
          name,
          kind,
          localAddress: local.address,
          localPort: local.port,
          remoteAddress: remote.address,
          remotePort: remote.port,
        }
      : undefined;
  }
  const bitRate = section.quantity('bitRate', { unit: '1/s', least: 10e3, most: 1e6 });
  const dataBitRate = section.quantity('dataBitRate', { unit: '1/s', least: 10e3, most: 10e6 });
  const units = readUnits(section);
  const rates = {
    ...(units.length === 0 ? {} : { units }),
    ...(bitRate === undefined ? {} : { bitRate }),
    ...(dataBitRate === undefined ? {} : { dataBitRate }),
  };
  if (kind === 'can') {
    const device = section.text('interface', { required: true }, 'can0');
    section.finish();
    if (device === undefined) return undefined;
    // IFNAMSIZ of Linux: 16 with the terminating zero.
    if (!/^[^\s/]{1,15}$/.test(device))
      return section.fail('interface', 'not the name of an interface', 'use at most 15 characters, such as can0', {
        value: shown(device),
      });
    return { name, kind, interface: device, ...rates };
  }
  const group = section.has('group')
    ? readAddress(section, 'group', `${usualGroup.address}:${usualGroup.port}`)
    : usualGroup;
  // Frames stay on this computer unless the file says by which of its addresses they are to leave.
  const own = section.text('by', {}, '127.0.0.1') ?? '127.0.0.1';
  section.finish();
  if (!isIPv4(own))
    return section.fail('by', 'not an IPv4 address', 'name an address of this computer, such as 127.0.0.1', {
      value: shown(own),
    });
  if (group && !/^2(2[4-9]|3\d)\./.test(group.address))
    return section.fail(
      'group',
      'not a multicast group',
      `use one of 224.0.0.0 to 239.255.255.255, such as ${usualGroup.address}`,
      {
        value: shown(group.address),
      },
    );
  return group && { name, kind, localAddress: own, remoteAddress: group.address, remotePort: group.port, ...rates };
}

/** `units: { engine: { address: 0, identity: 4711, function: 0 } }`: whose addresses the bench claims (SAE J1939-81). */
function readUnits(section: Section): AddressedUnit[] {
  return section.sections('units').flatMap(([unit, inner]) => {
    const address = inner.whole('address', { least: 0, most: 253 }, { required: true });
    const parts = Object.entries(nameLimits).map(
      ([part, most]) => [part, inner.whole(part, { least: 0, most }) ?? 0] as const,
    );
    inner.finish();
    return address === undefined ? [] : [{ unit, address, name: Object.fromEntries(parts) as unknown as UnitName }];
  });
}

function readAddress(
  section: Section,
  key: string,
  example: string,
): { readonly address: string; readonly port: number } | undefined {
  const said = section.text(key, { required: true }, example);
  if (said === undefined) return undefined;
  const match = /^([^:]+):(\d{1,5})$/.exec(said);
  const port = match ? Number(match[2]) : 0;
  if (!match || !isIPv4(match[1]!) || port < 1 || port > 65535) {
    return section.fail(key, 'not an IPv4 address with a port', `write it as in ${example}`, { value: shown(said) });
  }
  return { address: match[1]!, port };
}
