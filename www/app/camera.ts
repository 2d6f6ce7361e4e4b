import { css, html, type PropertyValues, type TemplateResult } from 'lit';
import type { Source } from '../kit/client';
import { tell } from './event';
import { Panel } from './panels';
import { words } from './words';

export const hasCamera = (): boolean => typeof navigator.mediaDevices?.getUserMedia === 'function';

function explain(error: unknown): string {
  const name = error instanceof DOMException ? error.name : '';
  if (name === 'NotAllowedError' || name === 'SecurityError') return words.cameraRefused;
  if (name === 'NotFoundError' || name === 'OverconstrainedError') return words.cameraNone;
  if (name === 'NotReadableError' || name === 'AbortError') return words.cameraBusy;
  return words.cameraFailed(error instanceof Error ? error.message : String(error));
}

/** Takes pictures straight into the pile. */
export class CameraPanel extends Panel {
  static override properties = { taken: { state: true }, problem: { state: true }, running: { state: true } };
  declare taken: number;
  declare problem: string | undefined;
  declare running: boolean;
  protected readonly label = words.cameraTitle;
  #stream: MediaStream | undefined;

  constructor() {
    super();
    this.taken = 0;
    this.running = false;
  }

  protected override firstUpdated(changed: PropertyValues<this>): void {
    super.firstUpdated(changed);
    void this.#start();
  }

  override disconnectedCallback(): void {
    super.disconnectedCallback();
    for (const track of this.#stream?.getTracks() ?? []) track.stop();
    this.#stream = undefined;
  }

  async #start(): Promise<void> {
    this.problem = undefined;
    try {
      const stream = await navigator.mediaDevices.getUserMedia({
        audio: false,
        video: { facingMode: 'environment', width: { ideal: 1920 }, height: { ideal: 1440 } },
      });
      if (!this.isConnected) {
        for (const track of stream.getTracks()) track.stop();
        return;
      }
      this.#stream = stream;
      const video = this.renderRoot.querySelector('video');
      if (!video) return;
      video.srcObject = stream;
      await video.play();
      this.running = true;
    } catch (error) {
      this.problem = explain(error);
    }
  }

  async #shoot(): Promise<void> {
    const video = this.renderRoot.querySelector('video');
    if (!video || video.videoWidth === 0) return;
    const canvas = document.createElement('canvas');
    canvas.width = video.videoWidth;
    canvas.height = video.videoHeight;
    canvas.getContext('2d')?.drawImage(video, 0, 0);
    const blob = await new Promise<Blob | null>((resolve) => canvas.toBlob(resolve, 'image/jpeg', 0.92));
    if (!blob) return;
    this.taken++;
    const time = new Date().toISOString().slice(0, 19).replaceAll(':', '-');
    tell<{ sources: Source[] }>(this, 'pictures', { sources: [{ name: `camera ${time} ${this.taken}.jpg`, blob }] });
  }

  protected content(): TemplateResult {
    return html`<h2>${words.cameraTitle}</h2>
      <video muted playsinline ?hidden=${this.problem !== undefined}></video>
      ${this.problem === undefined
        ? html`<p role="status">${this.running ? words.shot(this.taken) : words.cameraStarting}</p>`
        : html`<p role="alert">${this.problem}</p>`}
      <div class="row end">
        ${this.problem === undefined
          ? html`<button class="bright" autofocus ?disabled=${!this.running} @click=${() => void this.#shoot()}>${words.shoot}</button>`
          : html`<button @click=${() => void this.#start()}>${words.tryAgain}</button>`}
        <button @click=${() => this.close()}>${words.done}</button>
      </div>`;
  }

  static override styles = [
    ...Panel.styles,
    css`
      video {
        width: 100%;
        max-height: 60dvh;
        border-radius: 8px;
        background: #000;
      }
    `,
  ];
}

customElements.define('ken-camera', CameraPanel);
