import { describe, expect, it } from 'vitest';
import { networkOf } from '../../src/access/places.js';

describe('whose an address is', () => {
  it.each([
    ['10.0.0.1', '10.0.0.1'],
    ['::ffff:10.0.0.1', '10.0.0.1'],
    ['::1', '0:0:0:0::/64'],
    ['2001:db8::1', '2001:db8:0:0::/64'],
    ['2001:DB8:0:0:1:2:3:4', '2001:db8:0:0::/64'],
    ['2001:db8:0:1::1', '2001:db8:0:1::/64'],
    ['2001:0db8::00ff:1', '2001:db8:0:0::/64'],
    ['2001:db8:a:b:c:d:e::', '2001:db8:a:b::/64'],
    ['fe80::1%eth0', 'fe80:0:0:0::/64'],
    ['', ''],
  ])('%s is of %s', (address, network) => {
    expect(networkOf(address)).toBe(network);
  });
});
