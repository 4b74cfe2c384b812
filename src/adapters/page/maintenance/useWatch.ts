import { api, model } from '../lib/page.js';
import { type Answer, useAnswer } from '../lib/useAnswer.js';
import { useMinute } from './useMinute.js';
import type { Watch } from './wire.js';

/** What the indicators show: asked again each minute, and at once when an alarm says that one changed. */
export function useWatch(unit: string): Answer<Watch> {
  const minute = useMinute();
  const { alarmNews, connection } = model;
  const key = `${unit} ${minute} ${alarmNews.value} ${connection.value}`;
  return useAnswer(key, (signal) => api.get<Watch>(api.path(unit, 'watch'), {}, signal));
}
