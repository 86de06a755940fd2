// Scenes, keys, colours: what holds the page together.
const root = document.documentElement;
root.classList.add("scripted");

const players = [...document.querySelectorAll("article.scene")].map((article) => makePlayer(
  article, JSON.parse(document.getElementById(`data-${article.dataset.scene}`).textContent)));
const articles = [...document.querySelectorAll("article.scene")];
let shown = -1;

function showScene(index, move) {
  if (index < 0 || index >= players.length || index === shown) return;
  shown = index;
  articles.forEach((article, i) => {
    article.hidden = i !== index;
    if (i !== index) players[i].deactivate();
  });
  for (const link of document.querySelectorAll("[data-scene-link]")) {
    if (Number(link.dataset.sceneLink) === index + 1) link.setAttribute("aria-current", "true");
    else link.removeAttribute("aria-current");
  }
  document.title = players.length > 1 ? `${players[index].data.title} · Briefing` : document.title;
  players[index].activate();
  if (move) window.scrollTo(0, 0);
}

function sceneOfAddress() {
  const found = /^#scene-(\d+)$/.exec(location.hash);
  return found ? Number(found[1]) - 1 : 0;
}
window.addEventListener("hashchange", () => {
  if (location.hash.startsWith("#scene-")) showScene(sceneOfAddress(), true);
});
showScene(Math.min(Math.max(sceneOfAddress(), 0), players.length - 1), false);

function remembered(name, value) { // a browser that keeps nothing is no fault
  try {
    if (value !== undefined) localStorage.setItem(name, value);
    return localStorage.getItem(name);
  } catch (error) { return null; }
}

const theme = document.getElementById("theme");
const dark = window.matchMedia("(prefers-color-scheme: dark)");
const isDark = () => (root.dataset.theme ? root.dataset.theme === "dark" : dark.matches);
if (["dark", "light"].includes(remembered("latepull-theme"))) root.dataset.theme = remembered("latepull-theme");
function themeWords() { theme.textContent = isDark() ? "Light" : "Dark"; }
theme.addEventListener("click", () => {
  root.dataset.theme = isDark() ? "light" : "dark";
  remembered("latepull-theme", root.dataset.theme);
  themeWords();
});
dark.addEventListener("change", themeWords);
themeWords();

const keysDialog = document.getElementById("keys");
const keysOn = document.getElementById("keys-on");
document.getElementById("show-keys").addEventListener("click", () => keysDialog.showModal());
keysDialog.querySelector("[data-close]").addEventListener("click", () => keysDialog.close());

const KEYS = { " ": "play", k: "play", n: "next", p: "previous", s: "slow", v: "plain", f: "full" };
const ALWAYS = { ArrowLeft: "back", ArrowRight: "forward", Home: "first", End: "last" };

document.addEventListener("keydown", (event) => {
  if (event.ctrlKey || event.altKey || event.metaKey || event.defaultPrevented || document.querySelector("dialog[open]")) return;
  const target = event.target;
  const onSlider = target.classList.contains("scrub");
  if (target.matches("input, textarea, select") || target.closest(".scroll") && /^Arrow/.test(event.key)) return;
  const player = players[shown];
  let name = null;
  if (onSlider || keysOn.checked) {
    name = ALWAYS[event.key] || null;
    if ((event.key === "Home" || event.key === "End") && !onSlider && !target.closest(".film-box")) name = null;
    if (event.shiftKey && (name === "back" || name === "forward")) name = `second-${name}`;
    if (onSlider && event.key === "PageUp") name = "second-back";
    if (onSlider && event.key === "PageDown") name = "second-forward";
    if (onSlider && (event.key === "ArrowUp" || event.key === "ArrowDown")) name = event.key === "ArrowUp" ? "forward" : "back";
  }
  if (!name && keysOn.checked && !event.shiftKey) {
    if (event.key === " " && target.matches("button, a, summary")) return;
    name = KEYS[event.key.toLowerCase()] || null;
    if (!name && /^[1-9]$/.test(event.key) && Number(event.key) <= players.length && players.length > 1) {
      location.hash = `#scene-${event.key}`;
      event.preventDefault();
      return;
    }
  }
  if (!name || (event.repeat && !/back|forward/.test(name))) return;
  event.preventDefault();
  player.act(name);
});

makeSitting(players, () => players[shown]);
