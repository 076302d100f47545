"""The history of each airframe: what was flown, found, decided, inspected. It reads summaries and only ever grows."""
