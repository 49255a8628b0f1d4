// The marked stretch, by the path's own sample numbers, and the factor that is tried on it.

import { fixed } from "./data.js";

// told(event, ...values) tells the parts; repaint() has the rows' overlay drawn again.
export function markedStretch(ui, state, told, repaint) {
  let tried = null, held = false;

  function mark(first, last) {
    state.chosen = first === null ? null : { first: Math.min(first, last), last: Math.max(first, last) };
    tried = null;
    repaint();
    told("chosen");
  }

  // One end comes to the cursor; an end that would be passed comes with it.
  function setEnd(end) {
    const sample = ui.sample(), { first, last } = state.chosen || { first: sample, last: sample };
    if (end) mark(Math.min(first, sample), sample);
    else mark(sample, Math.max(last, sample));
  }

  function moveEnd(end, sample) {
    const { first, last } = state.chosen;
    mark(end ? first : Math.min(last, sample), end ? Math.max(first, sample) : last);
  }

  const ends = () => state.chosen && [state.chosen.first, state.chosen.last].map(state.axis.ofSample);

  // For the overlay, with its length in words.
  function shown() {
    if (!state.chosen) return null;
    const { time_s: [time], distance_mm: [along] } = state.data, a = ui.at(state.chosen.first), b = ui.at(state.chosen.last);
    return { ends: ends(), words: `marked: ${fixed(time[b] - time[a], 2)} s, ${fixed(along[b] - along[a], 1)} mm` };
  }

  // The least that is in force on the stretch, percent.
  function inForce() {
    const column = state.data.factor_percent[0].subarray(ui.at(state.chosen.first), ui.at(state.chosen.last) + 1);
    return state.facts.retiming.applied ? Math.min(...column) : 100;
  }

  // What is being tried, else what is in force; nothing where nobody listens.
  function factor() {
    return ui.ask && state.chosen ? { percent: tried || inForce(), tried: Boolean(tried) } : null;
  }

  function drag(percent, gesture) {
    tried = percent;
    held = true;
    repaint();
    told("factor", percent / 100, gesture);
  }

  // The answer to what was tried takes its place, but not under the hand.
  function answered() {
    if (!held) tried = null;
  }

  function release() {
    held = false;
    if (!tried || Math.abs(inForce() - tried) > 0.5) return;
    tried = null;
    repaint();
  }

  return { mark, setEnd, moveEnd, ends, shown, factor, drag, answered, release };
}
