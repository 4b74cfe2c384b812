/** Broken between day and time where there is no room, never within one. */
export function DayAndTime({ text }: { text: string }) {
  const [day, ...time] = text.split(' ');
  return (
    <>
      <span class="whole">{day}</span> <span class="whole">{time.join(' ')}</span>
    </>
  );
}
