// The one door to the service. Every failure leaves as an ApiError that says what kind it is.

const TIMEOUT_MS = 20000;

export class ApiError extends Error {
  /** kind: "network" (no answer), "timeout", or "problem" (the service refused; `detail` and `fields` say why). */
  constructor(kind, { status = null, detail = "", fields = [] } = {}) {
    super(detail || kind);
    this.kind = kind;
    this.status = status;
    this.detail = detail;
    this.fields = fields;
  }
}

async function readProblem(response) {
  const type = response.headers.get("content-type") ?? "";
  if (!type.includes("json")) return new ApiError("problem", { status: response.status });
  const body = await response.json();
  return new ApiError("problem", { status: response.status, detail: body.detail ?? body.title, fields: body.errors ?? [] });
}

async function get(path, query, signal) {
  const url = new URL(path, document.baseURI);
  for (const [name, value] of Object.entries(query)) if (value !== undefined) url.searchParams.set(name, value);
  const stop = new AbortController();
  let late = false;
  const timer = setTimeout(() => {
    late = true;
    stop.abort();
  }, TIMEOUT_MS);
  const cancel = () => stop.abort();
  signal.addEventListener("abort", cancel);
  try {
    const response = await fetch(url, { signal: stop.signal, headers: { accept: "application/json" } });
    if (!response.ok) throw await readProblem(response);
    return await response.json();
  } catch (error) {
    if (error instanceof ApiError || signal.aborted) throw error;
    throw new ApiError(late ? "timeout" : "network");
  } finally {
    clearTimeout(timer);
    signal.removeEventListener("abort", cancel);
  }
}

export const fetchSites = (signal) => get("v1/sites", {}, signal);
export const fetchFeeds = (signal) => get("v1/feeds", {}, signal);
/** place: {site} or {lat, lon, eye_height_m?}. */
/** question: {sun_elevation_deg, rain_mm_h}. */
export const fetchLight = (question, signal) => get("v1/light", question, signal);
export const fetchOutlook = (place, signal) => get("v1/outlook", place, signal);
