// One scene's film, in step with its charts. Frames are counted from 0; times[f] is the study's instant of frame f.
function makePlayer(article, data) {
  const videos = { annotated: article.querySelector("video.annotated"), plain: article.querySelector("video.plain") };
  const find = (name) => article.querySelector(`[data-do="${name}"]`);
  const scrub = article.querySelector(".scrub");
  const readout = Object.fromEntries(["since", "left", "height", "speed"].map(
    (name) => [name, article.querySelector(`.readout .${name}`)]));
  const charts = [...article.querySelectorAll("svg[data-t0]")].map((svg) => ({
    svg, cursor: svg.querySelector(".cursor"),
    t0: Number(svg.dataset.t0), t1: Number(svg.dataset.t1), x0: Number(svg.dataset.x0), x1: Number(svg.dataset.x1),
  }));
  const marks = ["side", "plan"].map((name) => ({
    mark: article.querySelector(`svg.path[data-view="${name}"] .here`), ...data.paths[name] }));
  const last = data.times.length - 1;
  const state = { kind: "annotated", frame: 0, wanted: null, slow: false, active: false, switching: false };
  const sources = { annotated: data.films.annotated, plain: data.films.plain };
  const listeners = [];
  const video = () => videos[state.kind];
  const clamp = (frame) => Math.min(Math.max(frame, 0), last);
  const frameOf = (mediaTime) => clamp(Math.floor(mediaTime * data.rate + 1e-3));
  const middle = (frame) => (frame + 0.5) / data.rate;

  function frameAt(time) { // the first frame that shows the instant or what comes after it
    let low = 0, high = data.card - 1;
    while (low < high) {
      const half = (low + high) >> 1;
      if (data.times[half] >= time - 1e-4) high = half; else low = half + 1;
    }
    return low;
  }

  function show(frame) {
    state.frame = frame;
    const time = data.times[frame];
    for (const c of charts) {
      const part = Math.min(Math.max((time - c.t0) / (c.t1 - c.t0), 0), 1);
      const x = (c.x0 + part * (c.x1 - c.x0)).toFixed(2);
      c.cursor.setAttribute("x1", x);
      c.cursor.setAttribute("x2", x);
    }
    for (const m of marks) {
      m.mark.setAttribute("cx", m.x[frame]);
      m.mark.setAttribute("cy", m.y[frame]);
    }
    const words = data.texts[Math.min(frame, data.texts.length - 1)];
    readout.since.textContent = words[0];
    readout.left.textContent = `${words[3]}: ${words[4]}`;
    readout.height.textContent = words[1];
    readout.speed.textContent = words[2];
    scrub.setAttribute("aria-valuenow", time.toFixed(4));
    scrub.setAttribute("aria-valuetext", `${words[0]}, ${words[3]}: ${words[4]}`);
    let current = null;
    for (const button of article.querySelectorAll("[data-moment]")) {
      button.removeAttribute("aria-current");
      if (Number(button.dataset.moment) <= time + 0.5 / data.rate) current = button;
    }
    if (current) current.setAttribute("aria-current", "true");
    for (const listener of listeners) listener(frame, time);
  }

  function follow(one) { // the cursor goes where the film is: at the very frame that is presented
    if (one.requestVideoFrameCallback) {
      const step = (now, meta) => {
        if (one === video() && state.active && state.wanted === null && !state.switching) show(frameOf(meta.mediaTime));
        one.requestVideoFrameCallback(step);
      };
      one.requestVideoFrameCallback(step);
      return;
    }
    const step = () => {
      if (one === video() && state.active && !one.paused) show(frameOf(one.currentTime));
      requestAnimationFrame(step);
    };
    requestAnimationFrame(step);
  }

  function seek(frame) {
    frame = clamp(frame);
    show(frame);
    const one = video();
    if (one.seeking) { // the newest wish counts; those between are never decoded
      state.wanted = frame;
      return;
    }
    state.wanted = frame;
    one.currentTime = middle(frame);
  }

  function seeked(one) {
    if (one !== video() || state.wanted === null) return;
    if (frameOf(one.currentTime) === state.wanted) state.wanted = null;
    else one.currentTime = middle(state.wanted);
  }

  function words() {
    const button = find("play");
    button.textContent = video().paused ? "Play" : "Pause";
  }

  async function play() {
    if (video().ended || state.frame >= last) seek(0);
    video().playbackRate = state.slow ? 0.25 : 1;
    try { await video().play(); } catch (error) { words(); }
  }

  function pause() {
    video().pause();
  }

  function toVersion(kind) {
    if (kind === state.kind || state.switching) return;
    const from = video(), to = videos[kind], running = !from.paused, frame = state.frame;
    from.pause();
    state.switching = true;
    const done = () => {
      to.removeEventListener("seeked", done);
      state.kind = kind;
      state.switching = false;
      state.wanted = null;
      to.classList.remove("off");
      from.classList.add("off");
      find("plain").setAttribute("aria-pressed", String(kind === "plain"));
      show(frame);
      if (running) play();
      words();
    };
    to.addEventListener("seeked", done);
    to.currentTime = middle(frame);
  }

  function slow(on) {
    state.slow = on;
    video().playbackRate = on ? 0.25 : 1;
    find("slow").setAttribute("aria-pressed", String(on));
  }

  function toMoment(way) {
    const frames = data.moments.map((time) => frameAt(time));
    const next = way > 0 ? frames.find((f) => f > state.frame) : frames.filter((f) => f < state.frame).pop();
    if (next !== undefined) { pause(); seek(next); }
  }

  function act(name) {
    if (name === "play") { if (video().paused) play(); else pause(); }
    else if (name === "back" || name === "forward") { pause(); seek(state.frame + (name === "back" ? -1 : 1)); }
    else if (name === "second-back" || name === "second-forward") {
      pause();
      seek(state.frame + Math.round(data.rate) * (name === "second-back" ? -1 : 1));
    }
    else if (name === "first" || name === "last") { pause(); seek(name === "first" ? 0 : data.card - 1); }
    else if (name === "previous" || name === "next") toMoment(name === "next" ? 1 : -1);
    else if (name === "slow") slow(!state.slow);
    else if (name === "plain") toVersion(state.kind === "plain" ? "annotated" : "plain");
    else if (name === "full") {
      if (document.fullscreenElement) document.exitFullscreen();
      else article.querySelector(".film-box").requestFullscreen();
    }
  }

  function pointTo(event) {
    const c = charts.find((one) => one.svg.closest(".linked") && one.svg.getClientRects().length);
    const point = new DOMPoint(event.clientX, event.clientY).matrixTransform(c.svg.getScreenCTM().inverse());
    const part = (point.x - c.x0) / (c.x1 - c.x0);
    if (part < -0.03 || part > 1.03) return;
    pause();
    seek(frameAt(c.t0 + Math.min(Math.max(part, 0), 1) * (c.t1 - c.t0)));
  }

  function missing(kind) {
    const box = article.querySelector(".missing");
    box.textContent = `The ${kind === "plain" ? "plain film" : "film with the margin"} of this scene can't be played: `
      + `${data.films.words[kind]} is missing beside this page or damaged. The figures below still hold; `
      + "put the file back, or make the page again.";
    box.hidden = false;
  }

  for (const [kind, one] of Object.entries(videos)) {
    one.controls = false;
    one.removeAttribute("src");
    one.classList.toggle("off", kind !== state.kind);
    one.addEventListener("seeked", () => seeked(one));
    one.addEventListener("error", () => { if (state.active && one.error) missing(kind); });
    for (const name of ["play", "pause", "ended"]) one.addEventListener(name, words);
    one.addEventListener("click", () => act("play"));
    follow(one);
  }
  for (const button of article.querySelectorAll("[data-do]")) {
    button.addEventListener("click", () => act(button.dataset.do));
  }
  for (const button of article.querySelectorAll("[data-moment]")) {
    button.addEventListener("click", () => { pause(); seek(frameAt(Number(button.dataset.moment))); });
  }
  // a mouse scrubs as it moves over the chart, a finger as it drags
  scrub.addEventListener("pointermove", (event) => { if (event.pointerType === "mouse" || event.buttons) pointTo(event); });
  scrub.addEventListener("pointerdown", pointTo);
  scrub.setAttribute("aria-valuemin", data.times[0].toFixed(4));
  scrub.setAttribute("aria-valuemax", data.times[data.card - 1].toFixed(4));

  return {
    data, act, seek, frameAt, video, videos, state, frameOf,
    onFrame: (listener) => listeners.push(listener),
    activate() {
      if (state.active) return;
      state.active = true;
      for (const [kind, one] of Object.entries(videos)) {
        one.preload = "auto";
        one.src = filmUrl(sources[kind]);
      }
      show(state.frame);
      if (state.frame) seek(state.frame);
    },
    deactivate() {
      if (!state.active) return;
      state.active = false;
      state.wanted = null;
      for (const one of Object.values(videos)) { // gives the decoder and its memory back
        one.pause();
        one.removeAttribute("src");
        one.load();
      }
      words();
    },
  };
}

const blobs = new Map();
function filmUrl(source) { // a file beside the page, or "#id" of a film inside it
  if (!source.startsWith("#")) return source;
  if (!blobs.has(source)) {
    const text = atob(document.getElementById(source.slice(1)).textContent.trim());
    const bytes = new Uint8Array(text.length);
    for (let i = 0; i < text.length; i += 1) bytes[i] = text.charCodeAt(i);
    blobs.set(source, URL.createObjectURL(new Blob([bytes], { type: "video/mp4" })));
  }
  return blobs.get(source);
}
