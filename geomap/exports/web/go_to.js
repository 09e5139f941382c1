// The box that goes to a place: a chainage, or a boring by its name as people type it.

// Without case, marks and leading zeros, but with the groups kept apart: BH5 is BH-05, and BH-1-05 is not BH-105.
function looseName(name) {
  const groups = name.normalize("NFKC").toLowerCase().match(/\p{L}+|\p{N}+/gu) || [];
  return groups.map((group) => group.replace(/^0+(?=\p{N})/u, "")).join("-");
}

function listenToGoTo(data, chainage, profile, plan, place) {
  const byId = (id) => document.getElementById(id);
  const names = data.borings.name;
  const alike = new Map();
  data.boringNumber.forEach((number, name) => {
    const loose = looseName(name);
    if (loose) alike.set(loose, [...(alike.get(loose) || []), number]);
  });
  for (const name of names) byId("places").append(element("option", { value: name }));

  function openBoring(number, source) {
    place.openBoring(number, source);
    if (data.borings.distance[number] !== null) profile.panTo(data.borings.distance[number]);
    plan.panToBoring(number);
  }

  // What is said of an entry that leads nowhere.
  function refusal(typed, borings) {
    if (borings.length > 1) return `Several borings are named so: ${borings.map((number) => names[number]).join(", ")}.`;
    const equation = chainage.swallowedBy(typed);
    if (equation) return `There is no such chainage: the equation ${equation} skips it.`;
    return `No such chainage or boring. The line runs from ${chainage.text(0)} to ${chainage.text(data.length)}.`;
  }

  byId("go-to").addEventListener("submit", (event) => {
    event.preventDefault();
    const typed = byId("go-to-place").value.trim();
    const answer = byId("go-to-answer");
    const exact = data.boringNumber.get(typed);
    const places = exact === undefined ? chainage.distances(typed) : [];
    const borings = exact === undefined ? alike.get(looseName(typed)) || [] : [exact];
    answer.textContent = "";
    if (places.length) {
      place.hold(places[0], null, "go");
      profile.panTo(places[0]);
      plan.panTo(places[0]);
      if (places.length > 1) answer.textContent = `This chainage stands ${places.length} times; the first is shown.`;
    } else if (borings.length === 1) openBoring(borings[0], "go");
    else answer.textContent = refusal(typed, borings);
  });
  return openBoring;
}
