// The count on the screen follows the machine: one stream of server-sent events a page.

const SILENT_MS = 20_000;
const RELOAD_MS = 120_000;
const zone = document.documentElement.dataset.zone || "UTC";
const clock = new Intl.DateTimeFormat("en-GB", { hour: "2-digit", minute: "2-digit", timeZone: zone });
const news = document.getElementById("news");
let heardAt = Date.now();

const at = (place, name) => place.querySelector(`[data-live="${name}"]`);
const shown = (turns) => {
  const text = Math.abs(turns - Math.round(turns)) < 0.05 ? String(Math.round(turns)) : turns.toFixed(1);
  const [whole, rest] = text.replace("-", "−").split(".");
  const spaced = whole.replace("−", "").length > 4 ? whole.replace(/\B(?=(\d{3})+$)/g, "\u202f") : whole;
  return rest ? `${spaced}.${rest}` : spaced;
};
const put = (place, name, text) => {
  const field = at(place, name);
  if (field && field.textContent !== text) field.textContent = text;
};

function heard() {
  heardAt = Date.now();
  news.hidden = true;
}

function take(count) {
  const place = document.querySelector(`[data-machine="${CSS.escape(count.machine_id)}"]`);
  if (!place) return;
  if (place.dataset.run !== count.run_serial) {
    // Another coil is on the machine than this page shows. A page with a form is left alone.
    if (!document.querySelector("form[data-keep], form.entry-form")) location.reload();
    return;
  }
  put(place, "to_go", shown(Math.abs(count.to_go)));
  put(place, "to_go_words", count.to_go < 0 ? "turns too many" : "turns to go");
  put(place, "turns", shown(count.turns));
  put(place, "speed", count.speed_rpm ? `, ${Math.round(count.speed_rpm)} rpm` : "");
  const progress = at(place, "progress");
  if (progress) progress.value = count.turns;
  const field = at(place, "heard");
  if (field) {
    field.dataset.heard = count.heard_at;
    field.textContent = `Counter heard ${clock.format(new Date(count.heard_at))}`;
  }
}

// A counter that stopped talking is told beside its machine; a stream that stopped, above them all.
function listenForSilence() {
  if (Date.now() - heardAt > SILENT_MS) {
    news.textContent = `No news since ${clock.format(new Date(heardAt))}: the counts below may be old.`;
    news.hidden = false;
  }
  for (const field of document.querySelectorAll('[data-live="heard"]')) {
    const last = field.dataset.heard;
    if (last && Date.now() - Date.parse(last) > SILENT_MS)
      field.textContent = `No news from the counter since ${clock.format(new Date(last))}`;
  }
}

const stream = new EventSource("/api/v1/live/floor");
stream.addEventListener("open", heard);
stream.addEventListener("quiet", heard);
stream.addEventListener("count", (event) => {
  heard();
  take(JSON.parse(event.data));
});
setInterval(listenForSilence, 1000);
window.addEventListener("pagehide", () => stream.close());

// Plans and wound coils change without a count: the floor page is read anew now and then.
if (document.body.classList.contains("floor"))
  setInterval(() => document.visibilityState === "visible" && location.reload(), RELOAD_MS);
