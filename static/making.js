// A file that takes the server a while: the link says so until it is there. Without this the link works all the same.
const says = document.querySelector("[data-making-says]");

async function fetchFile(link) {
  says.textContent = says.dataset.makingSays;
  const answer = await fetch(link.href);
  if (!answer.ok || answer.redirected) throw new Error(`the server answered ${answer.status}`);
  const named = /filename="?([^";]+)/.exec(answer.headers.get("Content-Disposition") ?? "");
  const whole = document.createElement("a");
  whole.href = URL.createObjectURL(await answer.blob());
  whole.download = named ? named[1] : "";
  whole.click();
  setTimeout(() => URL.revokeObjectURL(whole.href), 60000);
  says.textContent = `Here it is: ${whole.download}`;
}

for (const link of document.querySelectorAll("a[data-making]")) {
  let busy = false;
  link.addEventListener("click", async (event) => {
    event.preventDefault();
    if (busy) return;
    busy = true;
    try {
      await fetchFile(link);
    } catch {
      says.textContent = "";
      window.location.assign(link.href); // the browser shows what went wrong, or asks to sign in
    }
    busy = false;
  });
}
