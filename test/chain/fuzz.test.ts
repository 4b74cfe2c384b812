import { describe, expect, it } from 'vitest';
import { FuzzGround } from '../../tools/fuzz/ground.js';
import { temporaryFolder } from '../support/folders.js';
import { findProgram, PROGRAMS } from '../support/requirements.js';

const mosquitto = findProgram(PROGRAMS.mosquitto.names);

describe.skipIf(!mosquitto)('nonsense at every door, in short', () => {
  it('is counted message by message, answered as documented, and the daemon lives on', async () => {
    const ground = await FuzzGround.start(mosquitto!, temporaryFolder('fuzz'));
    try {
      expect(await ground.messages(11, 4000)).toEqual([]);
      expect(await ground.requests(12, 400)).toEqual([]);
      expect((await ground.metrics()).counter('messages')).toBe(4000);
    } finally {
      await ground.stop();
    }
  });
});
