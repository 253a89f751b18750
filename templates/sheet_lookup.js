"use strict";
// The look-up of the sheet. It reads the rule from the data beside it, finds the row that fits what
// is set, and says what stands there. It fetches nothing and keeps nothing.
(function () {
  var find = function (id) { return document.getElementById(id); };
  var data = JSON.parse(find("lookup-data").textContent);
  var fields = Array.prototype.slice.call(document.querySelectorAll("#lookup .ask"));
  var own = find("own");

  function whole(text) {
    return /^\s*[+-]?\d+\s*$/.test(text) ? Number(text) : NaN;
  }

  // What is set, one entry per ask: a number, or the place of an option; NaN where it is neither.
  function setNow() {
    var next = 0;
    var answers = data.asks.map(function (ask) {
      return ask.kind === "count" ? null : whole(fields[next++].value);
    });
    data.asks.forEach(function (ask, place) {
      if (ask.kind === "count") {
        answers[place] = ask.over.filter(function (other) {
          return answers[other] === ask.option;
        }).length;
      }
    });
    return answers;
  }

  function fits(row, answers) {
    return row.fits.every(function (wanted, place) {
      if (wanted === null) { return true; }
      var answer = answers[place];
      if (data.asks[place].kind === "choice") { return wanted.indexOf(answer) >= 0; }
      return (wanted[0] === null || answer >= wanted[0]) && (wanted[1] === null || answer <= wanted[1]);
    });
  }

  function within(ask, answer) {
    return answer >= ask.least && (ask.most === null || answer <= ask.most);
  }

  function impossible(answers) {
    return data.asks.some(function (ask, place) {
      return ask.kind === "number" && !within(ask, answers[place]);
    });
  }

  // "plus", "minus" or "watch"; "open" where a worth is known and the own evidence is not.
  function act(row, step) {
    if (data.bars) {
      var count = (data.flipped ? -1 : 1) * whole(own.value);
      if (row.plus !== null && count >= row.plus) { return "plus"; }
      return row.minus !== null && count <= row.minus ? "minus" : "watch";
    }
    var mine = evidence(step);
    if (mine === null) { return "open"; }
    var belief = data.own.prior + mine + Number(row.value);
    if (belief >= data.own.plus - data.own.tie) { return "plus"; }
    return belief <= data.own.minus + data.own.tie ? "minus" : "watch";
  }

  function evidence(step) {
    if (data.own.per_count !== null) {
      var count = (data.flipped ? -1 : 1) * whole(own.value);
      return data.own.per_count * count + data.own.per_step * step;
    }
    var text = own.value.trim().replace("\u2212", "-").replace(",", ".");
    return text === "" || !isFinite(Number(text)) ? null : Number(text);
  }

  function answered() {
    var says = data.says, answers = setNow(), step = answers[0];
    if (!within(data.asks[0], step)) {
      return { act: "none", head: says.late, line: "", then: says.late_then };
    }
    if (impossible(answers)) { return { act: "none", head: says.off, line: "", then: says.off_then }; }
    var rows = data.rows;
    if (data.unsure !== null && answers[data.unsure] === 1) {
      if (data.alone === null) {
        return { act: "none", head: says.unsure, line: "", then: says.unsure_then };
      }
      rows = data.alone;
    }
    for (var place = 0; place < rows.length; place += 1) {
      if (fits(rows[place], answers)) {
        var done = act(rows[place], step);
        return { act: done, head: says[done], line: rows[place].said, then: rows[place].then, row: rows[place], place: place };
      }
    }
    return { act: "none", head: says.none, line: "", then: says.none_then };
  }

  function pegWords() {
    var at = whole(own.value), text = String(at);
    if (data.pegs !== null && at !== 0) {
      text = (at > 0 ? data.pegs.plus : data.pegs.minus) + " " + String(Math.abs(at));
    }
    var atEnd = at === data.most || (data.pegs !== null && at === data.least);
    return atEnd && at !== 0 ? text + " " + data.says.or_more : text;
  }

  function show() {
    var found = answered(), box = find("lookup-said");
    box.className = found.act;
    box.setAttribute("data-act", found.act);
    box.setAttribute("data-row", found.row ? String(found.place) : "");
    box.setAttribute("data-worth", found.row && !data.bars ? String(found.row.value) : "");
    find("act").textContent = found.head;
    find("line").textContent = found.line;
    find("then").textContent = found.then;
    if (find("own-said")) {
      find("own-said").textContent = pegWords();
      own.setAttribute("aria-valuetext", pegWords());
    }
  }

  function press(id, work) {
    if (find(id)) { find(id).addEventListener("click", function () { work(); show(); }); }
  }

  fields.concat([own]).forEach(function (field) {
    field.addEventListener("input", show);
    field.addEventListener("change", show);
  });
  press("fewer", function () { own.stepDown(); });
  press("more", function () { own.stepUp(); });
  press("again", function () {
    fields.concat([own]).forEach(function (field) {
      if (field.tagName === "SELECT") { field.selectedIndex = 0; } else { field.value = field.defaultValue; }
    });
  });
  show();
  find("lookup").hidden = false;
}());
