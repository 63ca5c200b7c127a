"""The `upstroke` command: parse, call, render. It holds no science."""
