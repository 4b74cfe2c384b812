/** Broken between day and time where there is no room, never within one. */
export function DayAndTime({ text }: { text: string }) {
  return (
    <>
      {text.split(' ').map((word, i) => (
        <span key={word} class="whole">
          {i === 0 ? word : ` ${word}`}
        </span>
      ))}
    </>
  );
}
