import './app';

// After the first paint: what the page needs offline is fetched when nothing waits for it.
if ('serviceWorker' in navigator && import.meta.env.PROD) {
  addEventListener('load', () => void navigator.serviceWorker.register('./sw.js'));
}
