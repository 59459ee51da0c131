/**
 * How our plots look: one place for colours, fonts and sizes. Nothing is fetched from anywhere. The two outputs differ in
 * hue *and* lightness (dark blue, orange: told apart by every common colour blindness and in grey print); the stages
 * differ in line, never in colour alone.
 */
import type { Config } from 'vega-lite';

/** Fonts that are there: the reader's own. Metrics are estimated, so the picture is the same on every machine. */
const FONT = 'Helvetica, Arial, "DejaVu Sans", sans-serif';

export const COLOURS = {
  out1: '#0b3c6f',
  out2: '#d9730d',
  ink: '#222222',
  faint: '#757575',
  grid: '#e6e6e6',
} as const;

/** Size of the drawing area, px. */
export const PLOT_WIDTH = 720;
export const PLOT_HEIGHT = 360;

export const LOOK: Config = {
  background: '#ffffff',
  padding: 14,
  font: FONT,
  view: { stroke: COLOURS.faint, strokeWidth: 0.75 },
  title: {
    anchor: 'start',
    fontSize: 15,
    fontWeight: 600,
    color: COLOURS.ink,
    subtitleColor: '#555555',
    subtitleFontSize: 12,
    offset: 12,
  },
  axis: {
    labelFontSize: 12,
    titleFontSize: 13,
    titleFontWeight: 'normal',
    titlePadding: 10,
    labelColor: COLOURS.ink,
    titleColor: COLOURS.ink,
    gridColor: COLOURS.grid,
    domain: false,
    tickColor: COLOURS.faint,
  },
  legend: {
    labelFontSize: 12,
    symbolStrokeWidth: 2,
    symbolSize: 420,
    columnPadding: 24,
    orient: 'top',
    title: null,
    offset: 8,
  },
};
