"""Pictures of conclusions and records: SVG and PNG, the same bytes on every run, each with a caption that is honest.

One picture a file: `groups`, `pairs`, `over_time`, `evidence`, `spread`, `power`. Each makes a `drawing.Picture`; its
`captions` state procedure, unit, n, error rate, look, data position and what is set aside, inside the picture itself.
matplotlib is loaded when a picture is drawn, not when these files are.
"""
