"""What will the sea do?"""
