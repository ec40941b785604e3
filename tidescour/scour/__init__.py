"""How deep, for how long, and how far from the gap?"""
