"""What if, and how sure?"""
