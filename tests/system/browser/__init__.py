"""A real browser for tests: Chromium without a window, driven through a pipe by the DevTools protocol."""
