// What the page remembers on the device: the place chosen and the last answer. Nothing leaves it.
// A browser may refuse storage (private windows, full disk); the page then works without a memory.

const PLACE = "rainward.place";
const LAST = "rainward.last";

function read(key) {
  try {
    return JSON.parse(localStorage.getItem(key));
  } catch (refused) {
    console.info("nothing remembered:", refused.name);
    return null;
  }
}

function write(key, value) {
  try {
    localStorage.setItem(key, JSON.stringify(value));
  } catch (refused) {
    console.info("not remembered:", refused.name);
  }
}

const same = (a, b) => JSON.stringify(a) === JSON.stringify(b);

export const rememberPlace = (place) => write(PLACE, place);
export const lastPlace = () => read(PLACE);

/** answer: {place, outlook, feeds, received} */
export const rememberAnswer = (answer) => write(LAST, answer);
/** The last answer, if it was for this place and still reaches into the future. */
export function lastAnswer(place, now) {
  const kept = read(LAST);
  const end = kept?.outlook?.steps?.at(-1)?.time;
  return kept && same(kept.place, place) && Date.parse(end) > now ? kept : null;
}
