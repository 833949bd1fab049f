"""Small pieces of the window that pictures, forms and views are put together from."""
