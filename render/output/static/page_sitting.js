// A sitting: pilots call their own break-out on the plain film; instants kept in this browser, saved as CSV.
function makeSitting(players, current) {
  const KEPT = "latepull-calls";
  const dialog = document.getElementById("sitting");
  const film = document.getElementById("sitting-film");
  const go = document.getElementById("sitting-go");
  const wordsAt = document.getElementById("sitting-words");
  const body = document.querySelector("#calls-table tbody");
  const pilot = document.getElementById("pilot");
  const known = new Map(players.map((p) => [p.data.key, p.data]));
  let calls = load();
  let run = null;
  let opener = null;

  function load() {
    try {
      const rows = JSON.parse(localStorage.getItem(KEPT) || "[]");
      return Array.isArray(rows) ? rows.filter((r) => r && typeof r.key === "string" && known.has(r.key)
        && (r.time === null || Number.isFinite(r.time))) : [];
    } catch (error) { return []; }
  }

  function keep() { // rows of other pages stay as they are
    try {
      const others = JSON.parse(localStorage.getItem(KEPT) || "[]").filter((r) => !known.has(r.key));
      localStorage.setItem(KEPT, JSON.stringify([...others, ...calls]));
    } catch (error) {
      document.getElementById("calls-status").textContent =
        "This browser keeps nothing for this page: save the CSV before you close it.";
    }
  }

  const seconds = (value) => `${Math.abs(value).toFixed(2)} s`;
  function since(data, time) {
    if (time === null) return "no call";
    if (data.fault === null) return `${seconds(time)} from the start`;
    const value = time - data.fault;
    return value < 0 ? `${seconds(value)} before the fault` : seconds(value);
  }
  function against(data, time) {
    if (time !== null && data.fault !== null && time < data.fault) return "called before the fault";
    if (time === null || data.lastPull === null) return "-";
    const value = time - data.lastPull;
    return value > 0 ? `too late by ${seconds(value)}` : `${seconds(value)} in hand`;
  }

  function draw() {
    body.replaceChildren();
    if (!calls.length) {
      const row = body.insertRow();
      row.className = "none";
      const cell = row.insertCell();
      cell.colSpan = 9;
      cell.textContent = "No run yet.";
    }
    calls.forEach((call, i) => {
      const data = known.get(call.key), row = body.insertRow();
      const cells = [String(i + 1), call.pilot || "-", data.title, data.seat, since(data, call.time),
        data.likely === null ? "never" : since(data, data.likely),
        data.lastPull === null ? "does not run out" : since(data, data.lastPull), against(data, call.time)];
      for (const words of cells) row.insertCell().textContent = words;
      const button = document.createElement("button");
      button.type = "button";
      button.textContent = "Remove";
      button.setAttribute("aria-label", `Remove run ${i + 1}`);
      button.addEventListener("click", () => {
        calls.splice(i, 1); keep(); draw();
        document.getElementById("start-sitting").focus();
      });
      row.insertCell().append(button);
    });
    document.getElementById("save-calls").disabled = !calls.length;
    document.getElementById("clear-calls").disabled = !calls.length;
  }

  function csv() {
    const cell = (value) => (/[",\r\n]/.test(value) ? `"${value.replaceAll('"', '""')}"` : value);
    const lines = calls.map((call) => {
      const data = known.get(call.key);
      return [data.name, data.slot, call.time === null ? "" : call.time.toFixed(3),
        data.fault === null ? "" : data.fault.toFixed(3), call.pilot].map(cell).join(",");
    });
    return ["scene,seat,time_s,fault_s,pilot", ...lines, ""].join("\r\n");
  }

  function save() {
    const link = document.createElement("a");
    const url = URL.createObjectURL(new Blob([csv()], { type: "text/csv" }));
    link.href = url;
    link.download = "calls.csv";
    link.click();
    setTimeout(() => URL.revokeObjectURL(url), 10000);
    document.getElementById("calls-status").textContent = `${calls.length} run(s) saved as calls.csv.`;
  }

  function open(event) {
    if (event) opener = event.currentTarget;
    const player = current();
    player.videos[player.state.kind].pause();
    run = { player, frame: null, shown: 0, state: "ready" };
    // letters and digits only: a label, no name, and nothing a spreadsheet would take for a formula
    run.pilot = pilot.value.replace(/[^\p{L}\p{N} ]/gu, "").trim().slice(0, 12);
    wordsAt.textContent = "The plain film runs once at the speed of life. Press Space, Enter or the button at the instant you "
      + "would break out. What you pressed is shown when the film has ended.";
    go.textContent = "Start the film";
    go.disabled = false;
    film.src = filmUrl(player.data.films.plain);
    film.preload = "auto";
    watch();
    dialog.showModal();
    go.focus();
  }

  function watch() {
    const mine = run;
    const seen = (frame) => {
      mine.shown = frame;
      if (mine.state === "running" && frame >= mine.player.data.card) end(); // the card gives no instant
    };
    if (film.requestVideoFrameCallback) {
      const step = (now, meta) => {
        if (run !== mine) return;
        seen(mine.player.frameOf(meta.mediaTime));
        film.requestVideoFrameCallback(step);
      };
      film.requestVideoFrameCallback(step);
    } else {
      const step = () => {
        if (run !== mine) return;
        seen(mine.player.frameOf(film.currentTime));
        requestAnimationFrame(step);
      };
      requestAnimationFrame(step);
    }
  }

  function press() {
    if (run === null) return;
    if (run.state === "ready") {
      run.state = "running";
      go.textContent = "Break out!";
      wordsAt.textContent = "Press at the instant you would break out.";
      film.currentTime = 0;
      film.playbackRate = 1;
      film.play().catch(() => {
        run = null;
        wordsAt.textContent = "The plain film can't be played: it is missing beside this page or damaged.";
        go.disabled = true;
      });
    } else if (run.state === "running" && run.frame === null) {
      run.frame = run.shown; // the frame he had before his eyes
      go.textContent = "Noted";
      go.disabled = true;
      wordsAt.textContent = "Noted. The film runs on to its end.";
    } else if (run.state === "done") {
      open_again();
    }
  }

  function open_again() {
    film.removeAttribute("src");
    open();
  }

  function end() {
    if (run === null || run.state !== "running") return;
    run.state = "done";
    film.pause();
    const data = run.player.data;
    const time = run.frame === null ? null : data.times[run.frame];
    calls.push({ key: data.key, time, pilot: run.pilot });
    keep();
    draw();
    wordsAt.textContent = time === null ? "You called no break-out in this run."
      : `You called ${since(data, time)}${data.fault !== null && time >= data.fault ? " after the fault" : ""}. `
        + (data.fault !== null && time < data.fault ? "Nothing had failed yet." : data.lastPull === null ? "The margin does not run out here."
          : `Against the last pull: ${against(data, time)}.`);
    go.textContent = "Next run";
    go.disabled = false;
    go.focus();
  }

  function close() {
    run = null;
    film.pause();
    film.removeAttribute("src");
    film.load();
    if (opener) opener.focus();
  }

  film.addEventListener("ended", end);
  go.addEventListener("click", (event) => { if (event.detail) press(); }); // keys are taken on their way down, below
  document.getElementById("sitting-close").addEventListener("click", () => dialog.close());
  dialog.addEventListener("close", close);
  dialog.addEventListener("keydown", (event) => {
    event.stopPropagation();
    if (event.target.id === "sitting-close" || !(event.key === " " || event.key === "Enter")) return;
    event.preventDefault();
    if (!event.repeat) press();
  });
  go.addEventListener("keyup", (event) => { if (event.key === " ") event.preventDefault(); });
  for (const button of document.querySelectorAll("#start-sitting, [data-call]")) button.addEventListener("click", open);
  document.getElementById("save-calls").addEventListener("click", save);
  document.getElementById("clear-calls").addEventListener("click", () => { calls = []; keep(); draw(); });
  draw();
  return { csv, calls: () => calls };
}
