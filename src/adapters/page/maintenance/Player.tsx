import { useEffect, useRef, useState } from 'preact/hooks';
import { ageText, dateClock } from '../lib/format.js';
import { Choices } from '../parts/Choices.js';
import { neighbour, secondsOf } from './moments.js';
import type { Playback, PlayedMoment } from './wire.js';

const SPEEDS = ['2', '5', '12'];
/** Keys that step from stored moment to stored moment, whatever lies between them. */
const WAYS: Readonly<Record<string, -1 | 1>> = {
  ArrowLeft: -1,
  ArrowDown: -1,
  ArrowRight: 1,
  ArrowUp: 1,
};

/** Slider, steps and playing over stored moments. It plays only when somebody asks for it. */
export function Player({
  playback,
  at_s,
  moment,
  onChoose,
}: {
  playback: Playback;
  at_s: number;
  moment: PlayedMoment | null;
  onChoose(at_s: number): void;
}) {
  const { profiles, every_s } = playback;
  const [playing, setPlaying] = useState(false);
  const [speed, setSpeed] = useState('5');
  const first = secondsOf(profiles[0]!);
  const last = secondsOf(profiles.at(-1)!);
  // A step goes from the moment that is shown; where nothing is, from the time that was chosen.
  const now = useRef(at_s);
  now.current = moment === null ? at_s : secondsOf(moment);

  const step = (way: -1 | 1): boolean => {
    const next = neighbour(profiles, now.current, way);
    if (next === null) return false;
    // The next key may come before this one is drawn.
    now.current = secondsOf(next);
    onChoose(now.current);
    return true;
  };
  const latest = useRef(step);
  latest.current = step;
  useEffect(() => {
    if (!playing) return;
    const timer = window.setInterval(() => {
      if (!latest.current(1)) setPlaying(false);
    }, 1000 / Number(speed));
    return () => window.clearInterval(timer);
  }, [playing, speed]);

  const play = () => {
    // From the end it begins anew.
    if (!playing && at_s >= last) onChoose(first);
    setPlaying(!playing);
  };
  const words =
    moment === null ? `${dateClock(at_s * 1000)}, nothing stored` : dateClock(moment.time);
  return (
    <div class="rock-player">
      <input
        type="range"
        aria-label="Time of the profiles"
        aria-valuetext={words}
        min={first}
        max={last}
        step="any"
        value={at_s}
        onKeyDown={(event) => {
          const way = event.ctrlKey || event.altKey || event.metaKey ? undefined : WAYS[event.key];
          if (way === undefined) return;
          event.preventDefault();
          setPlaying(false);
          step(way);
        }}
        onInput={(event) => {
          setPlaying(false);
          onChoose(Number(event.currentTarget.value));
        }}
      />
      <div class="rock-asks">
        <button type="button" aria-label="One stored moment back" onClick={() => step(-1)}>
          <Glyph d="M11,2 L4,8 L11,14 Z M2,2 v12" />
        </button>
        <button type="button" class="play" aria-pressed={playing} onClick={play}>
          <Glyph d={playing ? 'M4,2 v12 M11,2 v12' : 'M4,2 L13,8 L4,14 Z'} />
          {playing ? ' Pause' : ' Play'}
        </button>
        <button type="button" aria-label="One stored moment on" onClick={() => step(1)}>
          <Glyph d="M5,2 L12,8 L5,14 Z M14,2 v12" />
        </button>
        <Choices
          legend="A second shows"
          name="playback-speed"
          options={SPEEDS.map((value) => ({ value, label: pace(every_s * Number(value)) }))}
          chosen={speed}
          onChoose={setSpeed}
        />
      </div>
    </div>
  );
}

/** Plant time in one second of looking: `50 min`, `2 h 00 min`. */
const pace = (seconds: number) => ageText(seconds).replace(' 00 s', '').replace(' 00 min', '');

function Glyph({ d }: { d: string }) {
  return (
    <svg class="rock-glyph" viewBox="0 0 16 16" aria-hidden="true">
      <path d={d} />
    </svg>
  );
}
