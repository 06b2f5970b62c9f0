"""Room: library. Calibrations at hand, outside any day: their curves judged, compared and drawn."""
